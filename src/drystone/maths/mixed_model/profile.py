"""Profile likelihood of one component: its interval and the test that it is zero."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.special import chdtrc, chdtri

from drystone.maths.mixed_model.fit import Fit, fit
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.refuse import (
    FlatLikelihoodError,
    InvalidProblemError,
    SingularCovarianceError,
)

#: How far above the estimate the upper end is looked for, in doublings.
DOUBLINGS = 200
#: The fall where the covariance has no inverse: finite, so that a root can still be bracketed.
RULED_OUT = 1e300


@dataclass(frozen=True)
class ProfileInterval:
    """Values of a component that the likelihood does not rule out.

    Parameters
    ----------
    low, high : float
        Ends; `low` is zero where the profile does not fall far enough.
    confidence_percent : float
        Confidence of the interval.
    """

    low: float
    high: float
    confidence_percent: float


@dataclass(frozen=True)
class ZeroTest:
    """Likelihood-ratio test that a component is zero.

    Parameters
    ----------
    statistic : float
        Twice the fall of the log-likelihood.
    p : float
        Half the upper tail of chi-squared with one degree of freedom (Self & Liang 1987).
    """

    statistic: float
    p: float


def profile_interval(
    prepared: Prepared, fitted: Fit, level: str, confidence_percent: float = 95.0
) -> ProfileInterval:
    """{v: 2 (l_max - l_profile(v)) <= chi-squared quantile}, other components re-estimated.

    The piece of the set that holds the fitted maximum: where starts disagreed
    (`Certificate.starts_agree`), the likelihood has other maxima and the set other pieces.

    Raises
    ------
    FlatLikelihoodError
        If the profile never falls, however large the component.
    """
    limit = float(chdtri(1, 1.0 - confidence_percent / 100.0))
    best = _component(fitted, level)

    def above(value: float) -> float:
        return _fall(prepared, fitted, level, value) - limit

    low = 0.0
    if best > 0.0 and above(0.0) > 0.0:
        low = _root(above, 0.0, best)
    inside, outside = _bracket(above, best, fitted)
    return ProfileInterval(low, _root(above, inside, outside), confidence_percent)


def zero_test(prepared: Prepared, fitted: Fit, level: str) -> ZeroTest:
    """Test of a component at its boundary."""
    if _component(fitted, level) == 0.0:
        return ZeroTest(0.0, 1.0)
    statistic = max(0.0, _fall(prepared, fitted, level, 0.0))
    return ZeroTest(statistic, 0.5 * float(chdtrc(1, statistic)))


def _component(fitted: Fit, level: str) -> float:
    if level not in fitted.components:
        raise InvalidProblemError(f"The model has no level '{level}'.", level=level)
    return fitted.components[level]


def _fall(prepared: Prepared, fitted: Fit, level: str, value: float) -> float:
    """Twice the fall of the profile log-likelihood from its maximum."""
    start = {**fitted.components, level: value}
    try:
        held = fit(prepared, fitted.estimator, {level: value}, [start])
    except SingularCovarianceError:
        return RULED_OUT
    return 2.0 * (fitted.log_likelihood - held.log_likelihood)


def _bracket(above: Callable[[float], float], best: float, fitted: Fit) -> tuple[float, float]:
    inside = best
    spread = fitted.heterogeneity or float(np.diag(fitted.covariance).max())
    outside = 2.0 * best if best > 0.0 else spread
    for _ in range(DOUBLINGS):
        if above(outside) > 0.0:
            return inside, outside
        inside, outside = outside, 2.0 * outside
    raise FlatLikelihoodError("The likelihood does not bound this component from above.")


def _root(above: Callable[[float], float], low: float, high: float) -> float:
    from scipy.optimize import brentq  # 0.2 s that most fits never need

    return float(brentq(above, low, high, xtol=1e-15 * high, rtol=1e-13))
