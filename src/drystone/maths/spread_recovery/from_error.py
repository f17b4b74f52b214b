"""SDs from other printed spreads of one arm.

Symbols: s SD of replicates; n replicates; se standard error of the mean; L, U limits of the
mean's confidence interval; h half its width; t(p; n - 1) quantile of Student's distribution.
All arrays have shape (k,) or broadcast to it; NaN in gives NaN out.

References
----------
Cochrane Handbook for Systematic Reviews of Interventions, version 6, section 6.5.2.2 (SE and
confidence interval of one mean).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from drystone.maths.spread_recovery.arrays import Floats, floats, quiet
from drystone.maths.spread_recovery.critical import t_quantile, z_quantile


def sd_from_se(se: npt.ArrayLike, n: npt.ArrayLike) -> Floats:
    """SD from the standard error of a mean, s = se sqrt(n).

    Parameters
    ----------
    se : (k,) float, >= 0, unit of the mean
    n : (k,) float, >= 1, replicates behind this mean

    Returns
    -------
    (k,) float, unit of the mean
    """
    se, n = floats(se), floats(n)
    with quiet():
        return np.asarray(se * np.sqrt(n))


def sd_from_variance(variance: npt.ArrayLike) -> Floats:
    """SD from the variance of replicates, s = sqrt(variance).

    Parameters
    ----------
    variance : (k,) float, >= 0, squared unit of the mean
    """
    with quiet():
        return np.asarray(np.sqrt(floats(variance)))


def sd_from_cv_percent(cv_percent: npt.ArrayLike, mean: npt.ArrayLike) -> Floats:
    """SD from the coefficient of variation of one arm, s = CV% mean / 100.

    Parameters
    ----------
    cv_percent : (k,) float, >= 0, in percent of ``mean``
    mean : (k,) float, > 0, the mean that the CV belongs to: the arm's own, or the grand mean for
        the CV of an analysis of variance
    """
    with quiet():
        return np.asarray(floats(cv_percent) * floats(mean) / 100.0)


def sd_from_limits(
    lower: npt.ArrayLike,
    upper: npt.ArrayLike,
    n: npt.ArrayLike,
    confidence_percent: npt.ArrayLike,
) -> Floats:
    """SD from the confidence limits of one mean, s = sqrt(n) (U - L) / (2 t).

    Parameters
    ----------
    lower, upper : (k,) float, lower < upper, unit of the mean
    n : (k,) float, >= 2, replicates behind this mean
    confidence_percent : (k,) float, between 0 and 100, such as 95

    Returns
    -------
    (k,) float, unit of the mean; NaN where n < 2

    Notes
    -----
    Takes the interval to be mean +- t(n - 1) SE. Not for back-transformed, bootstrap or pooled
    intervals.
    """
    with quiet():
        half = floats(upper) / 2.0 - floats(lower) / 2.0
    return sd_from_half_width(half, n, confidence_percent)


def sd_from_half_width(
    half_width: npt.ArrayLike, n: npt.ArrayLike, confidence_percent: npt.ArrayLike
) -> Floats:
    """SD from half the width of the confidence interval of one mean, s = sqrt(n) h / t.

    Parameters
    ----------
    half_width : (k,) float, >= 0, unit of the mean
    n, confidence_percent : as in `sd_from_limits`
    """
    with quiet():
        return np.asarray(
            np.sqrt(floats(n)) * floats(half_width) / t_quantile(n, confidence_percent)
        )


def sd_from_limits_by_z(
    lower: npt.ArrayLike,
    upper: npt.ArrayLike,
    n: npt.ArrayLike,
    confidence_percent: npt.ArrayLike,
) -> Floats:
    """SD from confidence limits that were made as mean +- z SE, s = sqrt(n) (U - L) / (2 z).

    Parameters
    ----------
    lower, upper, n, confidence_percent : as in `sd_from_limits`

    Notes
    -----
    For papers that say so. With few replicates it differs much from t: at n 6 and 95 % the SD is
    31 % larger.
    """
    with quiet():
        half = floats(upper) / 2.0 - floats(lower) / 2.0
    return sd_from_half_width_by_z(half, n, confidence_percent)


def sd_from_half_width_by_z(
    half_width: npt.ArrayLike, n: npt.ArrayLike, confidence_percent: npt.ArrayLike
) -> Floats:
    """SD from half the width of an interval mean +- z SE, s = sqrt(n) h / z."""
    with quiet():
        return np.asarray(np.sqrt(floats(n)) * floats(half_width) / z_quantile(confidence_percent))


def limit_asymmetry(mean: npt.ArrayLike, lower: npt.ArrayLike, upper: npt.ArrayLike) -> Floats:
    """How unevenly limits lie about the mean, |(U - m) - (m - L)| / (U - L); 0 when centred."""
    mean, lower, upper = floats(mean), floats(lower), floats(upper)
    with quiet():
        return np.asarray(np.abs((upper - mean) - (mean - lower)) / (upper - lower))
