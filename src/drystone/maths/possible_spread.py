"""Means and SDs that no set of values can have.

Symbols: m mean; s SD (n - 1 below the line); n values; a, b smallest and largest value that can
occur; h half a unit of the last printed digit.

References
----------
Largest SD: all values at an end of the scale; formula sheet `sd.max_bounded`, `sd.max_nonneg`
(elementary). Means of whole numbers: Brown and Heathers 2017, Soc Psychol Pers Sci 8:363,
doi 10.1177/1948550616673876; their SDs: Anaya 2016 (preprint; memory).
"""

from __future__ import annotations

import math

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]

MOST_VALUES = 1000  # beyond, every printed mean is possible


def largest_sd(mean: npt.ArrayLike, n: npt.ArrayLike, low: float, high: float) -> Floats:
    """Largest SD of ``n`` values between ``low`` and ``high``, sqrt((m - a)(b - m) n / (n - 1)).

    With ``high`` infinite: all values but one stand at ``low``, (m - a) sqrt(n).

    Parameters
    ----------
    mean : (k,) float, unit of the values
    n : (k,) float, >= 1; NaN comes out for 1
    low, high : float, ends of the scale; ``high`` may be infinite

    Returns
    -------
    (k,) float, NaN for a mean outside the scale
    """
    mean, n = np.asarray(mean, dtype=np.float64), np.asarray(n, dtype=np.float64)
    with np.errstate(all="ignore"):
        if math.isinf(high):
            found = np.where((n > 1) & (mean >= low), (mean - low) * np.sqrt(n), np.nan)
        else:
            found = np.sqrt((mean - low) * (high - mean) * n / np.where(n > 1, n - 1.0, np.nan))
    return np.asarray(found)


def sums_behind(mean: float, half_unit: float, n: int) -> list[int]:
    """Whole sums of ``n`` whole numbers whose mean prints as ``mean``; empty when there is none.

    Parameters
    ----------
    mean : float, >= 0, as printed
    half_unit : float, h
    n : int, >= 1

    Examples
    --------
    >>> sums_behind(5.19, 0.005, 28)
    []
    >>> sums_behind(3.45, 0.005, 20)
    [69]
    """
    room = half_unit * (1.0 + 1e-9) + 1e-12 * abs(mean)
    first = math.ceil((mean - room) * n - 1e-9 * n)
    last = math.floor((mean + room) * n + 1e-9 * n)
    return [k for k in range(first, last + 1) if abs(k / n - mean) <= room]


def squares_behind(
    mean: float, mean_half_unit: float, sd: float, sd_half_unit: float, n: int
) -> list[tuple[int, int]]:
    """Sums and sums of squares of ``n`` whole numbers that print as ``mean`` and ``sd``.

    The sum of squares is whole, has the parity of the sum, and is no less than n times the
    squared mean. That is necessary, not sufficient.

    Parameters
    ----------
    mean, sd : float, >= 0, as printed
    mean_half_unit, sd_half_unit : float
    n : int, >= 2

    Examples
    --------
    >>> squares_behind(3.45, 0.005, 1.19, 0.005, 20)
    [(69, 265)]
    >>> squares_behind(3.45, 0.005, 1.16, 0.005, 20)
    []
    """
    low, high = max(sd - sd_half_unit, 0.0), sd + sd_half_unit
    found = []
    for total in sums_behind(mean, mean_half_unit, n):
        base = total * total / n
        first = math.ceil(base + (n - 1) * low**2 * (1 - 1e-9) - 1e-9)
        last = math.floor(base + (n - 1) * high**2 * (1 + 1e-9) + 1e-9)
        first += (first - total) % 2
        if first <= last:
            found += [(total, square) for square in range(first, min(last, first + 20) + 1, 2)]
    return found
