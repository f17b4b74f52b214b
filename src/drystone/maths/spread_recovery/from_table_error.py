"""SD common to all arms from what stands under a table of means: MSE, SEM, SED, LSD, HSD, CV%.

Symbols: s = sqrt(MSE), the residual SD of one replicate; n1, n2 replicates of the two means that
are compared; f degrees of freedom of the error. All arrays have shape (k,) or broadcast to it; NaN
in gives NaN out, and so do numbers that cannot be.

In a design with blocks s has the blocks taken out already. Used with n = blocks it gives the
variance of a comparison within blocks, so no correlation between the arms may be applied to it.

References
----------
Steel & Torrie (1980) Principles and Procedures of Statistics, 2nd ed. (LSD, HSD, SED, coefficient
of variation of an analysis of variance; from memory). Kramer (1956) Biometrics 12:307-310 (HSD with
unequal replication). Unequal n1 and n2 enter as 1/n1 + 1/n2 in place of 2/n.
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from drystone.maths.spread_recovery.arrays import Floats, floats, only_where, quiet
from drystone.maths.spread_recovery.critical import t_quantile_of_df
from drystone.maths.spread_recovery.from_error import sd_from_cv_percent, sd_from_variance
from drystone.maths.spread_recovery.from_test import sd_from_se_of_difference
from drystone.maths.spread_recovery.studentised_range import studentised_range_quantile


def pooled_sd(
    sd1: npt.ArrayLike, n1: npt.ArrayLike, sd2: npt.ArrayLike, n2: npt.ArrayLike
) -> Floats:
    """Pooled SD of two arms, sqrt(((n1 - 1) sd1^2 + (n2 - 1) sd2^2) / (n1 + n2 - 2)).

    Parameters
    ----------
    sd1, sd2 : (k,) float, >= 0
    n1, n2 : (k,) float, >= 1 and not both 1
    """
    sd1, n1, sd2, n2 = floats(sd1), floats(n1), floats(sd2), floats(n2)
    df = n1 + n2 - 2.0
    with quiet():
        # the larger SD goes out first: its square may be too large a number
        top = np.maximum(np.maximum(sd1, sd2), np.finfo(float).tiny)
        parts = (n1 - 1.0) / df * (sd1 / top) ** 2 + (n2 - 1.0) / df * (sd2 / top) ** 2
        return np.asarray(top * np.sqrt(only_where((df > 0) & (n1 >= 1) & (n2 >= 1), parts)))


def sd_from_mse(mse: npt.ArrayLike) -> Floats:
    """SD from the mean square of the error, sqrt(MSE).

    Parameters
    ----------
    mse : (k,) float, >= 0, squared unit of the means
    """
    return sd_from_variance(mse)


def sd_from_sem(sem: npt.ArrayLike, n1: npt.ArrayLike, n2: npt.ArrayLike) -> Floats:
    """SD from one standard error of the mean for the whole table, SEM sqrt(n).

    Parameters
    ----------
    sem : (k,) float, >= 0
    n1, n2 : (k,) float, >= 1; unequal ones enter by their harmonic mean
    """
    return sd_from_sed(np.sqrt(2.0) * floats(sem), n1, n2)


def sd_from_sed(sed: npt.ArrayLike, n1: npt.ArrayLike, n2: npt.ArrayLike) -> Floats:
    """SD from the standard error of a difference, SED sqrt(n / 2).

    Parameters
    ----------
    sed : (k,) float, >= 0
    n1, n2 : (k,) float, >= 1
    """
    return sd_from_se_of_difference(sed, n1, n2)


def sd_from_lsd(
    lsd: npt.ArrayLike,
    n1: npt.ArrayLike,
    n2: npt.ArrayLike,
    error_df: npt.ArrayLike,
    confidence_percent: npt.ArrayLike,
) -> Floats:
    """SD from a least significant difference, LSD = t(f) sqrt(MSE (1/n1 + 1/n2)).

    Parameters
    ----------
    lsd : (k,) float, >= 0
    n1, n2 : (k,) float, >= 1
    error_df : (k,) float, >= 1; with T treatments: (T - 1)(B - 1) in B blocks, T (n - 1) without.
        In a split plot the error of the stratum that the comparison belongs to.
    confidence_percent : (k,) float, 95 for an LSD at 0.05
    """
    with quiet():
        sed = floats(lsd) / t_quantile_of_df(error_df, confidence_percent)
    return sd_from_sed(sed, n1, n2)


def sd_from_hsd(
    hsd: npt.ArrayLike,
    n1: npt.ArrayLike,
    n2: npt.ArrayLike,
    number_of_means: npt.ArrayLike,
    error_df: npt.ArrayLike,
    confidence_percent: npt.ArrayLike,
) -> Floats:
    """SD from Tukey's honestly significant difference, HSD = q sqrt(MSE (1/n1 + 1/n2) / 2).

    Parameters
    ----------
    hsd : (k,) float, >= 0
    n1, n2 : (k,) float, >= 1
    number_of_means : (k,) float, whole, >= 2, how many means the test compares
    error_df, confidence_percent : as in `sd_from_lsd`
    """
    q = studentised_range_quantile(number_of_means, error_df, confidence_percent)
    with quiet():
        sem = floats(hsd) / q
    return sd_from_sem(sem, n1, n2)


def sd_from_table_cv_percent(cv_percent: npt.ArrayLike, grand_mean: npt.ArrayLike) -> Floats:
    """SD from the CV% of an analysis of variance: of the GRAND mean, not of an arm's own.

    Parameters
    ----------
    cv_percent : (k,) float, >= 0
    grand_mean : (k,) float, > 0, mean of the whole table
    """
    return sd_from_cv_percent(cv_percent, grand_mean)
