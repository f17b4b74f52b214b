"""Between raw and log scale: means of logs, geometric means, their ratio.

Symbols: m, s mean and SD of the values; l, u mean and SD of their natural logarithms. The formulas
take the values to be log-normal. log10 is natural log / ln 10; log(x + 1) cannot be turned back.
All arrays have shape (k,) or broadcast to it; NaN in gives NaN out.

References
----------
Higgins, White & Anzures-Cabrera (2008) Stat Med 27:6072-6092 (raw <-> log scale).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from drystone.maths.spread_recovery.arrays import Floats, floats, only_where, quiet
from drystone.maths.spread_recovery.critical import t_quantile

LN_10 = float(np.log(10.0))


@dataclass(frozen=True)
class Moments:
    """Mean and SD, each (k,), on one scale."""

    mean: Floats
    sd: Floats


@dataclass(frozen=True)
class LogRatio:
    """Log ratio ``y`` of two means and its sampling variance ``v``, each (k,)."""

    y: Floats
    v: Floats


def to_log(mean: npt.ArrayLike, sd: npt.ArrayLike) -> Moments:
    """Mean and SD of natural logs from mean and SD of the values.

    Parameters
    ----------
    mean : (k,) float, > 0 (NaN comes back otherwise)
    sd : (k,) float, >= 0

    Returns
    -------
    Moments
        ``u^2 = ln(1 + s^2 / m^2)``, ``l = ln m - u^2 / 2``
    """
    mean = only_where(floats(mean) > 0, mean)
    with quiet():
        variance = np.log1p((floats(sd) / mean) ** 2)
        return Moments(np.asarray(np.log(mean) - variance / 2.0), np.asarray(np.sqrt(variance)))


def from_log(mean_log: npt.ArrayLike, sd_log: npt.ArrayLike) -> Moments:
    """Mean and SD of the values from mean and SD of their natural logs.

    Parameters
    ----------
    mean_log : (k,) float, any sign; for a geometric mean g it is ln g
    sd_log : (k,) float, >= 0

    Returns
    -------
    Moments
        ``m = exp(l + u^2 / 2)``, ``s = m sqrt(exp(u^2) - 1)``; infinite when too large a number
    """
    with quiet():
        variance = floats(sd_log) ** 2
        mean = np.exp(floats(mean_log) + variance / 2.0)
        return Moments(np.asarray(mean), np.asarray(mean * np.sqrt(np.expm1(variance))))


def from_log10(mean_log10: npt.ArrayLike, sd_log10: npt.ArrayLike) -> Moments:
    """Mean and SD of the values from mean and SD of their logs to base 10; see `from_log`."""
    return from_log(LN_10 * floats(mean_log10), LN_10 * floats(sd_log10))


def log_sd_from_limits(
    lower: npt.ArrayLike,
    upper: npt.ArrayLike,
    n: npt.ArrayLike,
    confidence_percent: npt.ArrayLike,
) -> Floats:
    """SD of natural logs from back-transformed limits of a geometric mean.

    Parameters
    ----------
    lower, upper : (k,) float, 0 < lower < upper, unit of the values
    n : (k,) float, >= 2
    confidence_percent : (k,) float, such as 95

    Returns
    -------
    (k,) float, ``sqrt(n) (ln upper - ln lower) / (2 t(n - 1))``
    """
    lower, upper = floats(lower), floats(upper)
    possible = (lower > 0) & (upper > 0)
    with quiet():
        width = np.log(only_where(possible, upper)) - np.log(only_where(possible, lower))
        return np.asarray(np.sqrt(floats(n)) * width / (2.0 * t_quantile(n, confidence_percent)))


def ratio_of_geometric_means(
    mean_log1: npt.ArrayLike,
    sd_log1: npt.ArrayLike,
    n1: npt.ArrayLike,
    mean_log2: npt.ArrayLike,
    sd_log2: npt.ArrayLike,
    n2: npt.ArrayLike,
) -> LogRatio:
    """Difference of two means of logs, which is the log ratio of GEOMETRIC means.

    Parameters
    ----------
    mean_log1, mean_log2, sd_log1, sd_log2 : (k,) float, natural logs; arm 1 over arm 2
    n1, n2 : (k,) float, >= 1

    Returns
    -------
    LogRatio
        ``y = l1 - l2``, ``v = u1^2 / n1 + u2^2 / n2``
    """
    with quiet():
        variance = floats(sd_log1) ** 2 / floats(n1) + floats(sd_log2) ** 2 / floats(n2)
        return LogRatio(np.asarray(floats(mean_log1) - floats(mean_log2)), np.asarray(variance))


def ratio_of_arithmetic_means(
    mean_log1: npt.ArrayLike,
    sd_log1: npt.ArrayLike,
    n1: npt.ArrayLike,
    mean_log2: npt.ArrayLike,
    sd_log2: npt.ArrayLike,
    n2: npt.ArrayLike,
) -> LogRatio:
    """Log ratio of the ARITHMETIC means of two log-normal arms, from their logs.

    Parameters
    ----------
    mean_log1, mean_log2, sd_log1, sd_log2 : (k,) float, natural logs; arm 1 over arm 2
    n1, n2 : (k,) float, >= 2

    Returns
    -------
    LogRatio
        ``y = (l1 - l2) + (u1^2 - u2^2) / 2``; its variance adds ``u^4 / (2 (n - 1))`` for each arm,
        the variance of half a sample variance (Cox's interval for a log-normal mean: Land 1972
        Technometrics 14:145-158, from memory)
    """
    plain = ratio_of_geometric_means(mean_log1, sd_log1, n1, mean_log2, sd_log2, n2)
    with quiet():
        var1, var2 = floats(sd_log1) ** 2, floats(sd_log2) ** 2
        more = [v**2 / (2.0 * (floats(n) - 1.0)) for v, n in ((var1, n1), (var2, n2))]
        return LogRatio(plain.y + (var1 - var2) / 2.0, plain.v + more[0] + more[1])
