"""SDs that cannot be: the largest that a mean and n allow, and what a printed zero hides.

All arrays have shape (k,) or broadcast to it; NaN in gives NaN out.

References
----------
Largest SD between bounds: all values at the two ends (Bhatia & Davis 2000 Am Math Mon 107:353-357,
with n / (n - 1) for the sample variance; derived). Non-negative values: one value holds the whole
sum (derived).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from drystone.maths.spread_recovery.arrays import Floats, floats, only_where, quiet


def largest_sd_between(
    mean: npt.ArrayLike, lowest: npt.ArrayLike, highest: npt.ArrayLike, n: npt.ArrayLike
) -> Floats:
    """Largest SD of n values between two bounds, sqrt((m - L)(U - m) n / (n - 1)).

    Parameters
    ----------
    mean, lowest, highest : (k,) float, lowest <= mean <= highest (NaN comes back otherwise)
    n : (k,) float, >= 2
    """
    mean, n = floats(mean), floats(n)
    with quiet():
        room = (mean - floats(lowest)) * (floats(highest) - mean)
        return np.asarray(np.sqrt(only_where((room >= 0) & (n >= 2), room * n / (n - 1.0))))


def largest_sd_above_zero(mean: npt.ArrayLike, n: npt.ArrayLike) -> Floats:
    """Largest SD of n values that cannot be negative, m sqrt(n), so that CV <= sqrt(n).

    Parameters
    ----------
    mean : (k,) float, >= 0
    n : (k,) float, >= 2
    """
    mean, n = floats(mean), floats(n)
    with quiet():
        return np.asarray(only_where((mean >= 0) & (n >= 2), mean) * np.sqrt(n))


def largest_sd_printed_as_zero(decimals: npt.ArrayLike) -> Floats:
    """Half a unit of the last place: an SD below it is printed as zero.

    Parameters
    ----------
    decimals : (k,) float, whole, digits after the point
    """
    with quiet():
        return np.asarray(0.5 * 10.0 ** -floats(decimals))
