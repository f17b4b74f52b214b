"""How much true effects differ: Q, typical sampling variance, I2, CVH, M and R2.

Sources: Q and H2, Higgins & Thompson 2002 (Stat Med 21:1539); I2 by level, Nakagawa & Santos 2012
(Evol Ecol 26:1253); CVH and M, Yang et al. 2025 (doi 10.1111/2041-210x.70155); R2, Nakagawa &
Schielzeth 2013 (Methods Ecol Evol 4:133). With sampling variances that rest on an average, I2 is
conditional on them.
"""

from dataclasses import dataclass, replace

import numpy as np
from scipy.special import chdtrc

from drystone.maths.mixed_model.criterion import Evaluation, evaluate
from drystone.maths.mixed_model.derivatives import slope
from drystone.maths.mixed_model.fit import Fit
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import ROW, SCALE, Term
from drystone.maths.mixed_model.refuse import NoInterceptError, SingularCovarianceError


@dataclass(frozen=True)
class HomogeneityTest:
    """Test that sampling error alone explains the rows (Cochran's Q, generalised).

    Parameters
    ----------
    q : float
        (y - Xb)' inverse(V) (y - Xb), with b from inverse(V) weights.
    degrees_of_freedom : int
        K - p.
    p : float
        Upper tail of chi-squared.
    h2 : float
        Q / (K - p), called H2_Q (not phylogenetic heritability).
    """

    q: float
    degrees_of_freedom: int
    p: float
    h2: float


@dataclass(frozen=True)
class Shares:
    """Heterogeneity as shares of the total variance of a typical row.

    Parameters
    ----------
    typical_variance : float
        (K - p) / tr(P) at V alone, times the estimated factor of V if there is one.
    total : float
        I2, between 0 and 1.
    by_level : dict of str to float
        I2 of each level.
    """

    typical_variance: float
    total: float
    by_level: dict[str, float]


@dataclass(frozen=True)
class RelativeSpread:
    """Heterogeneity relative to the size of the overall mean.

    Parameters
    ----------
    cvh1, cvh2, m1, m2 : float
        s / |mu|, s^2 / mu^2, s / (s + |mu|), s^2 / (s^2 + mu^2).
    """

    cvh1: float
    cvh2: float
    m1: float
    m2: float


@dataclass(frozen=True)
class Explained:
    """Shares of the variance of true effects that moderators and levels explain.

    Parameters
    ----------
    fixed_variance : float
        Variance of X b over the rows, K - 1 in the denominator.
    marginal : float
        By the moderators.
    conditional : float
        By moderators and all levels but the row level.
    """

    fixed_variance: float
    marginal: float
    conditional: float


def homogeneity_test(prepared: Prepared) -> HomogeneityTest:
    """Q with its chi-squared test, for any V and any design.

    Raises
    ------
    SingularCovarianceError
        If V has no inverse.
    """
    at = _known_only(prepared)[1]
    df = prepared.rows - prepared.width
    return HomogeneityTest(at.quadratic, df, float(chdtrc(df, at.quadratic)), at.quadratic / df)


def typical_variance(prepared: Prepared) -> float:
    """(K - p) / tr(P), P = V^-1 - V^-1 X (X' V^-1 X)^-1 X' V^-1; in O(K p).

    Equals the typical variance of Higgins & Thompson 2002 for a diagonal V and one mean.
    """
    plain, at = _known_only(prepared)
    half_trace = slope(plain, at, "REML").half_traces[0]
    return float((prepared.rows - prepared.width) / (2.0 * half_trace))


def shares(prepared: Prepared, fit: Fit) -> Shares:
    """I2 in total and by level."""
    typical = typical_variance(prepared) * fit.components.get(SCALE, 1.0)
    whole = fit.heterogeneity + typical
    by_level = {name: part / whole for name, part in fit.components.items() if name != SCALE}
    return Shares(typical, fit.heterogeneity / whole, by_level)


def relative_spread(prepared: Prepared, fit: Fit, level: str | None = None) -> RelativeSpread:
    """CVH and M, in total or of one level; only for a model with one overall mean.

    Raises
    ------
    NoInterceptError
        If the model has moderators.
    """
    design = prepared.problem.X
    if design.shape[1] != 1 or np.any(design != 1.0):
        raise NoInterceptError("CVH and M compare heterogeneity with one overall mean.")
    variance = fit.heterogeneity if level is None else fit.components[level]
    mean, spread = abs(float(fit.coefficients[0])), float(np.sqrt(variance))
    with np.errstate(divide="ignore", invalid="ignore"):
        cvh = np.float64(spread) / mean
        m1, m2 = np.float64(spread) / (spread + mean), np.float64(variance) / (variance + mean**2)
    return RelativeSpread(float(cvh), float(cvh**2), float(m1), float(m2))


def explained(prepared: Prepared, fit: Fit) -> Explained:
    """Marginal and conditional R2; sampling variance is not counted."""
    fixed = float(np.var(prepared.problem.X @ fit.coefficients, ddof=1))
    whole = fixed + fit.heterogeneity
    if whole == 0.0:
        return Explained(fixed, np.nan, np.nan)
    return Explained(fixed, fixed / whole, (whole - fit.components.get(ROW, 0.0)) / whole)


def _known_only(prepared: Prepared) -> tuple[Prepared, Evaluation]:
    """The same rows with V alone, and a row level held at zero for its trace."""
    variances = prepared.rotation.variances
    plain = replace(
        prepared,
        problem=replace(prepared.problem, terms=(Term(ROW),)),
        base=variances,
        slopes=np.ones((1, prepared.rows)),
    )
    at = evaluate(plain, np.zeros(1), "REML")
    if at is None:
        raise SingularCovarianceError("The known covariance has no inverse.")
    return plain, at
