"""SD common to both arms from a test of their difference, or from its confidence interval.

Symbols: m1, m2 means; n1, n2 replicates; s pooled SD; t Student's statistic of the comparison, so
that s = |m1 - m2| / (t sqrt(1/n1 + 1/n2)). All arrays have shape (k,) or broadcast to it; NaN in
gives NaN out, and so do numbers that cannot be (n < 1, p outside 0 to 1, F < 0).

The pooled two-sample test is meant. With a paired test, or one that takes blocks out, the same
formula gives the residual SD that makes the arms' variance right without any correlation between
them.

References
----------
Cochrane Handbook for Systematic Reviews of Interventions, version 6, section 6.5.2.3 (SDs from
standard errors, confidence intervals, t and p values for differences in means).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from drystone.maths.spread_recovery.arrays import Floats, floats, only_where, quiet
from drystone.maths.spread_recovery.critical import t_quantile_of_df


def sd_from_se_of_difference(se: npt.ArrayLike, n1: npt.ArrayLike, n2: npt.ArrayLike) -> Floats:
    """Pooled SD from the standard error of the difference of two means.

    Parameters
    ----------
    se : (k,) float, >= 0, unit of the means
    n1, n2 : (k,) float, >= 1, replicates

    Returns
    -------
    (k,) float, ``se / sqrt(1/n1 + 1/n2)``
    """
    n1, n2 = floats(n1), floats(n2)
    with quiet():
        return only_where((n1 >= 1) & (n2 >= 1), floats(se) / np.sqrt(1.0 / n1 + 1.0 / n2))


def sd_from_t(
    mean1: npt.ArrayLike,
    mean2: npt.ArrayLike,
    n1: npt.ArrayLike,
    n2: npt.ArrayLike,
    t: npt.ArrayLike,
) -> Floats:
    """Pooled SD from Student's t of two means; its sign does not matter.

    Parameters
    ----------
    mean1, mean2 : (k,) float
    n1, n2 : (k,) float, >= 1
    t : (k,) float

    Returns
    -------
    (k,) float; infinite for t = 0 with unequal means, NaN when the means are equal too
    """
    with quiet():
        se = np.abs(floats(mean1) - floats(mean2)) / np.abs(floats(t))
    return sd_from_se_of_difference(se, n1, n2)


def t_from_f(f: npt.ArrayLike) -> Floats:
    """Student's |t| from F with ONE degree of freedom in the numerator, sqrt(F); NaN for F < 0."""
    f = floats(f)
    with quiet():
        return np.asarray(np.sqrt(only_where(f >= 0, f)))


def t_from_p(p: npt.ArrayLike, df: npt.ArrayLike, sides: int = 2) -> Floats:
    """Student's |t| from an exact p value.

    Parameters
    ----------
    p : (k,) float, above 0 and below 1; a bound such as "p < 0.05" is not exact
    df : (k,) float, >= 1, degrees of freedom of the test: n1 + n2 - 2 for two independent arms
    sides : 2 (usual) or 1

    Returns
    -------
    (k,) float, upper quantile of Student's distribution at p / sides; NaN where p or df cannot be,
    and where a one-sided p exceeds a half, since the sign of t is then unknown

    Raises
    ------
    ValueError
        When ``sides`` is neither 1 nor 2.
    """
    if sides not in (1, 2):
        raise ValueError(f"a p value is one-sided or two-sided, not {sides}-sided")
    p, df = np.broadcast_arrays(floats(p), floats(df))
    known = (p > 0) & (p < 1) & (p / sides <= 0.5) & (df >= 1)
    found = np.full(p.shape, np.nan)
    found[known] = -special.stdtrit(df[known], p[known] / sides)
    return found


def sd_from_f(
    mean1: npt.ArrayLike,
    mean2: npt.ArrayLike,
    n1: npt.ArrayLike,
    n2: npt.ArrayLike,
    f: npt.ArrayLike,
) -> Floats:
    """Pooled SD from F of exactly these two means (numerator degrees of freedom 1)."""
    return sd_from_t(mean1, mean2, n1, n2, t_from_f(f))


def sd_from_p(
    mean1: npt.ArrayLike,
    mean2: npt.ArrayLike,
    n1: npt.ArrayLike,
    n2: npt.ArrayLike,
    p: npt.ArrayLike,
    df: npt.ArrayLike | None = None,
    sides: int = 2,
) -> Floats:
    """Pooled SD from an exact p value; ``df`` is n1 + n2 - 2 when absent. See `t_from_p`."""
    df = floats(n1) + floats(n2) - 2.0 if df is None else df
    return sd_from_t(mean1, mean2, n1, n2, t_from_p(p, df, sides))


def sd_from_difference_limits(
    lower: npt.ArrayLike,
    upper: npt.ArrayLike,
    n1: npt.ArrayLike,
    n2: npt.ArrayLike,
    confidence_percent: npt.ArrayLike,
    df: npt.ArrayLike | None = None,
) -> Floats:
    """Pooled SD from the confidence limits of the difference of two means.

    Parameters
    ----------
    lower, upper : (k,) float, unit of the means
    n1, n2 : (k,) float, >= 1
    confidence_percent : (k,) float, such as 95
    df : (k,) float, degrees of freedom of the interval; n1 + n2 - 2 when absent

    Returns
    -------
    (k,) float, ``(upper - lower) / (2 t(df) sqrt(1/n1 + 1/n2))``
    """
    df = floats(n1) + floats(n2) - 2.0 if df is None else df
    with quiet():
        half = floats(upper) / 2.0 - floats(lower) / 2.0
        se = half / t_quantile_of_df(df, confidence_percent)
    return sd_from_se_of_difference(se, n1, n2)
