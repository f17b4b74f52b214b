"""Two-sided critical values: Student, normal. Confidence in percent, as papers print it."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt
from scipy import special

from drystone.maths.spread_recovery.arrays import Floats, floats


def t_quantile(n: npt.ArrayLike, confidence_percent: npt.ArrayLike) -> Floats:
    """Two-sided quantile of Student's distribution with n - 1 degrees of freedom; NaN for n < 2."""
    return t_quantile_of_df(floats(n) - 1.0, confidence_percent)


def t_quantile_of_df(df: npt.ArrayLike, confidence_percent: npt.ArrayLike) -> Floats:
    """Two-sided quantile of Student's distribution.

    Parameters
    ----------
    df : (k,) float, >= 1
    confidence_percent : (k,) float, between 0 and 100, such as 95

    Returns
    -------
    (k,) float; NaN where df < 1 or the level is impossible
    """
    df, level = np.broadcast_arrays(floats(df), floats(confidence_percent) / 100.0)
    known = (df >= 1.0) & (level > 0.0) & (level < 1.0)
    quantile = np.full(df.shape, np.nan)
    quantile[known] = special.stdtrit(df[known], 0.5 + level[known] / 2.0)
    return quantile


def z_quantile(confidence_percent: npt.ArrayLike) -> Floats:
    """Two-sided quantile of the normal distribution; NaN where the level is impossible."""
    level = floats(confidence_percent) / 100.0
    known = (level > 0.0) & (level < 1.0)
    return np.asarray(
        np.where(known, special.ndtri(np.where(known, 0.5 + level / 2.0, 0.5)), np.nan)
    )
