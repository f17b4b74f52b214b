"""Baseline, final and change: SDs and their correlation.

Symbols: sb, sf, sc SD of baseline, of final values, of changes; r their correlation. All arrays
have shape (k,) or broadcast to it; NaN in gives NaN out.

References
----------
Cochrane Handbook for Systematic Reviews of Interventions, version 6, section 6.5.2.8 (correlation
and SD of changes); version 5.1, section 16.4.6 (paired differences).
"""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

from drystone.maths.spread_recovery.arrays import Floats, floats, only_where, quiet


def correlation_from_changes(
    sd_baseline: npt.ArrayLike, sd_final: npt.ArrayLike, sd_change: npt.ArrayLike
) -> Floats:
    """Correlation of baseline and final values, r = (sb^2 + sf^2 - sc^2) / (2 sb sf).

    Parameters
    ----------
    sd_baseline, sd_final : (k,) float, > 0
    sd_change : (k,) float, >= 0

    Returns
    -------
    (k,) float; NaN where the three SDs cannot go together (r outside -1 to 1)
    """
    first, last, change = floats(sd_baseline), floats(sd_final), floats(sd_change)
    with quiet():
        r = (first**2 + last**2 - change**2) / (2.0 * first * last)
        room = 1.0 + 4.0 * np.finfo(float).eps  # equal SDs and no change give 1, rounding apart
        return np.clip(only_where(np.abs(r) <= room, r), -1.0, 1.0)


def sd_of_change(
    sd_baseline: npt.ArrayLike, sd_final: npt.ArrayLike, correlation: npt.ArrayLike
) -> Floats:
    """SD of differences within units, sqrt(sb^2 + sf^2 - 2 r sb sf).

    Parameters
    ----------
    sd_baseline, sd_final : (k,) float, >= 0; or the two arms of a paired design
    correlation : (k,) float, -1 to 1 (NaN comes back otherwise)
    """
    first, last, r = floats(sd_baseline), floats(sd_final), floats(correlation)
    with quiet():
        # (sb - sf)^2 + 2 (1 - r) sb sf: the same, and never below zero by rounding
        square = (first - last) ** 2 + 2.0 * (1.0 - r) * first * last
        return np.asarray(np.sqrt(only_where(np.abs(r) <= 1.0, square)))


def se_of_mean_change(sd_change: npt.ArrayLike, n: npt.ArrayLike) -> Floats:
    """Standard error of the mean of n differences, sc / sqrt(n)."""
    with quiet():
        return np.asarray(floats(sd_change) / np.sqrt(floats(n)))


def sd_of_final(
    sd_baseline: npt.ArrayLike, sd_change: npt.ArrayLike, correlation: npt.ArrayLike
) -> Floats:
    """SD of final values from those of baseline and change: the larger root of the same equation.

    Parameters
    ----------
    sd_baseline, sd_change : (k,) float, >= 0
    correlation : (k,) float, -1 to 1, between baseline and final values

    Returns
    -------
    (k,) float, ``r sb + sqrt(sc^2 - (1 - r^2) sb^2)``; NaN where no final SD fits
    """
    first, change, r = floats(sd_baseline), floats(sd_change), floats(correlation)
    with quiet():
        square = change**2 - (1.0 - r**2) * first**2
        root = np.sqrt(only_where((square >= 0) & (np.abs(r) <= 1.0), square))
        return np.asarray(only_where(r * first + root >= 0, r * first + root))
