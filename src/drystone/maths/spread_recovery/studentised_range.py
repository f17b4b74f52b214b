"""Quantiles of the studentised range, by numerical integration.

With k independent standard normal values and an independent estimate S of their SD with f degrees
of freedom, q = range / S. P(range < r) = k Int phi(z) [Phi(z) - Phi(z - r)]^(k - 1) dz, and
P(q < x) averages this at r = x S over the distribution of ln S. Both integrands are analytic and
die off fast, so the trapezoidal rule converges faster than any power of its step.

References
----------
Tukey (1953) The problem of multiple comparisons (the test); Lund & Lund (1983) Applied Statistics
32:204-210 (the double integral).
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

import numpy as np
import numpy.typing as npt
from scipy import special

from drystone.maths.spread_recovery.arrays import Floats, floats

_Z = np.linspace(-8.5, 8.5, 171)
_STEP = float(_Z[1] - _Z[0])
_PHI = np.exp(-0.5 * _Z**2) / np.sqrt(2.0 * np.pi)
_CDF = special.ndtr(_Z)
_MOST_DF = 1e5  # beyond this q is that of the plain range to about 1e-5
_LOG_TINY = -42.0  # exp(-42) = 6e-19: weights below this are left out


def studentised_range_quantile(
    means: npt.ArrayLike, df: npt.ArrayLike, confidence_percent: npt.ArrayLike
) -> Floats:
    """Upper quantile of the studentised range, as printed in tables of q.

    Parameters
    ----------
    means : (k,) float, whole, 2 to 1000, how many means are compared
    df : (k,) float, >= 1, degrees of freedom of the error
    confidence_percent : (k,) float, such as 95 for a test at 0.05

    Returns
    -------
    (k,) float; NaN where a number cannot be
    """
    arrays = np.broadcast_arrays(floats(means), floats(df), floats(confidence_percent))
    found = np.full(arrays[0].shape, np.nan)
    known = np.isfinite(np.sum(arrays, axis=0))
    found[known] = [
        _one_quantile(*map(float, numbers))
        for numbers in zip(*(array[known] for array in arrays), strict=True)
    ]
    return found


def studentised_range_cdf(x: float, means: float, df: float) -> float:
    """P(q < x) for ``means`` values and ``df`` degrees of freedom (inf: the plain range)."""
    if df > _MOST_DF:
        return float(_range_cdf(np.array([x]), means)[0])
    logs, weights = _log_sd(df)
    return float(np.sum(weights * _range_cdf(x * np.exp(logs), means)))


@lru_cache(maxsize=512)
def _one_quantile(means: float, df: float, confidence_percent: float) -> float:
    level = confidence_percent / 100.0
    possible = 2 <= means <= 1000 and means == np.floor(means) and df >= 1 and 0 < level < 1
    if not possible:
        return float("nan")
    low, high = 0.0, 4.0
    while studentised_range_cdf(high, means, df) < level:
        low, high = high, 2.0 * high
    return _solve(low, high, lambda x: studentised_range_cdf(x, means, df) - level)


def _solve(low: float, high: float, gap: Callable[[float], float]) -> float:
    """Root of a rising function between ``low`` and ``high``: false position, Illinois variant."""
    at_low, at_high = gap(low), gap(high)
    for _ in range(100):
        middle = high - at_high * (high - low) / (at_high - at_low)
        at_middle = gap(middle)
        if (at_middle > 0) == (at_high > 0):
            at_low = 0.5 * at_low
        else:
            low, at_low = high, at_high
        done = abs(middle - high) <= 1e-13 * abs(middle)
        high, at_high = middle, at_middle
        if done or at_middle == 0:
            break
    return float(high)


def _range_cdf(r: Floats, means: float) -> Floats:
    inner = np.clip(_CDF - special.ndtr(_Z - r[:, None]), 0.0, 1.0)
    return np.asarray(means * _STEP * (inner ** (means - 1.0) @ _PHI))


@lru_cache(maxsize=64)
def _log_sd(df: float) -> tuple[Floats, Floats]:
    """Points of ln S and their weights, which sum to 1."""
    # with g(x) = x - e^(2 x) / 2 + 1/2 the weight of x is exp(f g); g <= -x^2 for x > 0,
    # g <= -x^2 / 3 for x in -1 .. 0, and g <= x + 1/2 everywhere
    reach = float(np.sqrt(-_LOG_TINY / df))
    near = np.sqrt(3.0) * reach
    low = -near if near <= 1.0 else _LOG_TINY / df - 0.5
    high = reach
    logs = np.linspace(low, high, 400)
    powers = df * (logs - 0.5 * np.exp(2.0 * logs) + 0.5)
    weights = np.exp(powers)
    return logs, weights / weights.sum()
