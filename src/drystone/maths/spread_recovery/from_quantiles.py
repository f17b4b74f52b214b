"""Mean and SD of one arm from its median, quartiles, smallest and largest value.

Symbols: a smallest, q1 first quartile, m median, q3 third quartile, b largest of n values. All take
the values to be near normal; `skewed_*` tests it. All arrays have shape (k,) or broadcast to it;
NaN in gives NaN out.

References
----------
Wan, Wang, Liu & Tong (2014) BMC Med Res Methodol 14:135, doi 10.1186/1471-2288-14-135 (SDs).
Luo, Wan, Liu & Tong (2018) Stat Methods Med Res 27:1785-1805 (means).
Shi, Luo, Weng, Zeng, Lin, Chu & Tong (2020) Res Synth Methods 11:641-654, doi 10.1002/jrsm.1429
(SD from five numbers).
Shi, Luo, Wan, Liu & Tong (2023), a test of skewness from summary data (its constants from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

from drystone.maths.spread_recovery.arrays import Floats, floats, only_where, quiet


@dataclass(frozen=True)
class SkewTest:
    """Statistic and critical value (5 %) of a test of skewness, each (k,)."""

    statistic: Floats
    critical: Floats

    @property
    def skewed(self) -> npt.NDArray[np.bool_]:
        """Where the statistic exceeds the critical value."""
        return np.asarray(self.statistic > self.critical)


def range_width(n: npt.ArrayLike) -> Floats:
    """Range of n normal values in SDs, 2 z((n - 0.375) / (n + 0.25)); NaN for n < 2 (Wan 2014)."""
    n = only_where(floats(n) >= 2, n)
    return np.asarray(2.0 * special.ndtri((n - 0.375) / (n + 0.25)))


def quartile_width(n: npt.ArrayLike) -> Floats:
    """Distance of the quartiles of n normal values in SDs (Wan 2014); NaN for n < 2."""
    n = only_where(floats(n) >= 2, n)
    return np.asarray(2.0 * special.ndtri((0.75 * n - 0.125) / (n + 0.25)))


def expected_range(n: npt.ArrayLike) -> Floats:
    """Exact expected range of n standard normal values, Int 1 - Phi^n - (1 - Phi)^n.

    Parameters
    ----------
    n : (k,) float, >= 2

    Returns
    -------
    (k,) float; what `range_width` approximates (4.5 % too large at n 2, 1.4 % at 5, -0.1 % at 25)
    """
    n = np.asarray(only_where(floats(n) >= 2, n))
    points = np.linspace(-12.0, 12.0, 481)  # trapezoidal rule: analytic, dies off at both ends
    log_up, log_down = special.log_ndtr(points), special.log_ndtr(-points)
    inner = -np.expm1(n[..., None] * log_up) - np.exp(n[..., None] * log_down)
    return np.asarray(inner.sum(axis=-1) * (points[1] - points[0]))


def sd_from_range(smallest: npt.ArrayLike, largest: npt.ArrayLike, n: npt.ArrayLike) -> Floats:
    """SD from smallest and largest value, (b - a) / `range_width` (Wan 2014)."""
    with quiet():
        return np.asarray((floats(largest) - floats(smallest)) / range_width(n))


def sd_from_quartiles(q1: npt.ArrayLike, q3: npt.ArrayLike, n: npt.ArrayLike) -> Floats:
    """SD from the quartiles, (q3 - q1) / `quartile_width` (Wan 2014)."""
    with quiet():
        return np.asarray((floats(q3) - floats(q1)) / quartile_width(n))


def sd_from_five_numbers(
    smallest: npt.ArrayLike,
    q1: npt.ArrayLike,
    q3: npt.ArrayLike,
    largest: npt.ArrayLike,
    n: npt.ArrayLike,
) -> Floats:
    """SD from range and quartiles together, with the best weights for size n (Shi 2020).

    Parameters
    ----------
    smallest, q1, q3, largest : (k,) float, rising
    n : (k,) float, >= 2
    """
    n = floats(n)
    with quiet():
        of_range = (1.0 + 0.07 * n**0.6) * range_width(n)
        of_quartiles = (1.0 + 1.0 / (0.07 * n**0.6)) * quartile_width(n)
        width, inner = floats(largest) - floats(smallest), floats(q3) - floats(q1)
        return np.asarray(width / of_range + inner / of_quartiles)


def mean_from_range(
    smallest: npt.ArrayLike, median: npt.ArrayLike, largest: npt.ArrayLike, n: npt.ArrayLike
) -> Floats:
    """Mean from smallest value, median and largest value (Luo 2018)."""
    with quiet():
        weight = 4.0 / (4.0 + floats(n) ** 0.75)
    return _weighted(weight, smallest, largest, median)


def mean_from_quartiles(
    q1: npt.ArrayLike, median: npt.ArrayLike, q3: npt.ArrayLike, n: npt.ArrayLike
) -> Floats:
    """Mean from quartiles and median (Luo 2018)."""
    with quiet():
        weight = 0.7 + 0.39 / floats(n)
    return _weighted(weight, q1, q3, median)


def mean_from_five_numbers(
    smallest: npt.ArrayLike,
    q1: npt.ArrayLike,
    median: npt.ArrayLike,
    q3: npt.ArrayLike,
    largest: npt.ArrayLike,
    n: npt.ArrayLike,
) -> Floats:
    """Mean from all five numbers (Luo 2018); see `five_number_weights`."""
    ends, quartiles, middle = five_number_weights(n)
    with quiet():
        outer, inner = ends * _midpoint(smallest, largest), quartiles * _midpoint(q1, q3)
        return np.asarray(outer + inner + middle * floats(median))


def five_number_weights(n: npt.ArrayLike) -> tuple[Floats, Floats, Floats]:
    """Weights of mid-range, mid-quartile and median, each (k,), with sum 1 (Luo 2018)."""
    n = floats(n)
    with quiet():
        ends = 2.2 / (2.2 + n**0.75)
        quartiles = 0.7 - 0.72 / n**0.55
        return np.asarray(ends), np.asarray(quartiles), np.asarray(1.0 - ends - quartiles)


def skewed_range(
    smallest: npt.ArrayLike, median: npt.ArrayLike, largest: npt.ArrayLike, n: npt.ArrayLike
) -> SkewTest:
    """Test of skewness from smallest value, median, largest value (Shi 2023, scenario 1)."""
    n = floats(n)
    with quiet():
        critical = 1.01 / np.log(n + 9.0) + 2.43 / (n + 1.0)
    return SkewTest(_off_centre(smallest, median, largest), np.asarray(critical))


def skewed_quartiles(
    q1: npt.ArrayLike, median: npt.ArrayLike, q3: npt.ArrayLike, n: npt.ArrayLike
) -> SkewTest:
    """Test of skewness from quartiles and median (Shi 2023, scenario 2)."""
    n = floats(n)
    with quiet():
        critical = 2.66 / np.sqrt(n) - 5.92 / n**2
    return SkewTest(_off_centre(q1, median, q3), np.asarray(critical))


def skewed_five_numbers(
    smallest: npt.ArrayLike,
    q1: npt.ArrayLike,
    median: npt.ArrayLike,
    q3: npt.ArrayLike,
    largest: npt.ArrayLike,
    n: npt.ArrayLike,
) -> SkewTest:
    """Test of skewness from all five numbers (Shi 2023, scenario 3)."""
    n = floats(n)
    with quiet():
        weight, critical = 2.65 * np.log(0.6 * n) / np.sqrt(n), 3.0 / np.sqrt(n) - 40.0 / n**3
        ends = weight * _off_centre(smallest, median, largest)
    statistic = np.maximum(ends, _off_centre(q1, median, q3))
    return SkewTest(np.asarray(statistic), np.asarray(critical))


def _off_centre(low: npt.ArrayLike, middle: npt.ArrayLike, high: npt.ArrayLike) -> Floats:
    low, middle, high = floats(low), floats(middle), floats(high)
    with quiet():
        return np.asarray(np.abs((low - middle) + (high - middle)) / (high - low))


def _midpoint(low: npt.ArrayLike, high: npt.ArrayLike) -> Floats:
    with quiet():
        return np.asarray(floats(low) / 2.0 + floats(high) / 2.0)


def _weighted(
    weight: Floats, low: npt.ArrayLike, high: npt.ArrayLike, median: npt.ArrayLike
) -> Floats:
    with quiet():
        return np.asarray(weight * _midpoint(low, high) + (1.0 - weight) * floats(median))
