"""SD, and mean where the centre is a median, from quartiles, smallest and largest value.

A median is replaced by the mean that goes with it only when the test of skewness lets it pass.
Skewed arms are asked about and their SD counts as missing: the formulas take the values to be near
normal, and for a skewed arm they can be far off in either direction.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from drystone.maths import spread_recovery as recover
from drystone.maths.spread_recovery import SkewTest
from drystone.sheet.conversion import (
    ArmNumbers,
    Conversion,
    Floats,
    Mask,
    Refusals,
    given,
    spread_given,
)

FEWEST_FOR_QUARTILES = 5  # Wan et al. 2014 derive them for n = 4 Q + 1 with Q of at least 1

_NEAR_NORMAL = (
    "the values of the arm are near normal; a median passed the test of skewness (Shi et al. "
    "2023), beside a mean there is no such test"
)
_WIDTH_ALONE = "the values of the arm are near normal, which a width alone cannot show"


def _five_given(arm: ArmNumbers) -> Mask:
    return given(arm.min, arm.q1, arm.q3, arm.max)


def _five_refused(arm: ArmNumbers) -> Refusals:
    yield from _few(arm)
    rising = (arm.min <= arm.q1) & (arm.q1 < arm.q3) & (arm.q3 <= arm.max)
    yield "min, q1, q3 and max do not rise in this order", ~rising
    yield from _centre_refused(arm, arm.q1, arm.q3, "the quartiles")
    yield _skewed(
        arm, recover.skewed_five_numbers(arm.min, arm.q1, arm.mean, arm.q3, arm.max, arm.n)
    )
    yield _unusable_mean(arm, _mean_of_five)


def _quartiles_refused(arm: ArmNumbers) -> Refusals:
    yield from _few(arm)
    yield "q1 is not below q3", ~(arm.q1 < arm.q3)
    yield from _centre_refused(arm, arm.q1, arm.q3, "the quartiles")
    yield _skewed(arm, recover.skewed_quartiles(arm.q1, arm.mean, arm.q3, arm.n))
    yield _unusable_mean(arm, _mean_of_quartiles)


def _range_refused(arm: ArmNumbers) -> Refusals:
    yield "min is not below max", ~(arm.min < arm.max)
    yield from _centre_refused(arm, arm.min, arm.max, "the smallest and largest value")
    yield _skewed(arm, recover.skewed_range(arm.min, arm.mean, arm.max, arm.n))
    yield _unusable_mean(arm, _mean_of_range)


def _few(arm: ArmNumbers) -> Refusals:
    few = arm.n < FEWEST_FOR_QUARTILES
    yield f"fewer than {FEWEST_FOR_QUARTILES} values have no quartiles to compute with", few


def _centre_refused(arm: ArmNumbers, low: Floats, high: Floats, ends: str) -> Refusals:
    outside = (arm.mean < low) | (arm.mean > high)
    yield f"the centre does not lie between {ends}: a typing error, or a skewed arm", outside


def _skewed(arm: ArmNumbers, test: SkewTest) -> tuple[str, Mask]:
    words = (
        "the median lies so unevenly that the values are skewed (test of Shi et al. 2023), and "
        "neither mean nor SD can be computed from it"
    )
    return words, arm.is_median & test.skewed


def _unusable_mean(arm: ArmNumbers, mean: Callable[[ArmNumbers], Floats]) -> tuple[str, Mask]:
    return "the mean that goes with this median would not be above zero", mean(arm) <= 0


def _mean_of_five(arm: ArmNumbers) -> Floats:
    found = recover.mean_from_five_numbers(arm.min, arm.q1, arm.mean, arm.q3, arm.max, arm.n)
    return np.where(arm.is_median, found, np.nan)


def _mean_of_quartiles(arm: ArmNumbers) -> Floats:
    found = recover.mean_from_quartiles(arm.q1, arm.mean, arm.q3, arm.n)
    return np.where(arm.is_median, found, np.nan)


def _mean_of_range(arm: ArmNumbers) -> Floats:
    found = recover.mean_from_range(arm.min, arm.mean, arm.max, arm.n)
    return np.where(arm.is_median, found, np.nan)


_FIVE = Conversion(
    "from five numbers",
    ("q1", "min", "q3", "max", "mean", "n"),
    "weighted range and quartile distance over those of n normal values (Shi et al. 2020)",
    _NEAR_NORMAL,
    lambda arm: recover.sd_from_five_numbers(arm.min, arm.q1, arm.q3, arm.max, arm.n),
    _five_given,
    _five_refused,
    centre=_mean_of_five,
)
_QUARTILES = Conversion(
    "from quartiles",
    ("q1", "q3", "mean", "n"),
    "(q3 - q1) over the quartile distance of n normal values (Wan et al. 2014)",
    _NEAR_NORMAL,
    lambda arm: recover.sd_from_quartiles(arm.q1, arm.q3, arm.n),
    lambda arm: given(arm.q1, arm.q3) & ~_five_given(arm),
    _quartiles_refused,
    centre=_mean_of_quartiles,
)
_RANGE = Conversion(
    "from range",
    ("min", "max", "mean", "n"),
    "(max - min) over the range of n normal values (Wan et al. 2014)",
    _NEAR_NORMAL,
    lambda arm: recover.sd_from_range(arm.min, arm.max, arm.n),
    lambda arm: given(arm.min, arm.max) & ~given(arm.q1, arm.q3),
    _range_refused,
    centre=_mean_of_range,
)
_QUARTILE_WIDTH = Conversion(
    "from IQR width",
    ("spread", "n"),
    "q3 - q1, over the quartile distance of n normal values (Wan et al. 2014)",
    _WIDTH_ALONE,
    lambda arm: recover.sd_from_quartiles(0.0, arm.spread, arm.n),
    lambda arm: spread_given(arm) & ~given(arm.q1, arm.q3) & ~given(arm.min, arm.max),
    _few,
)
_RANGE_WIDTH = Conversion(
    "from range width",
    ("spread", "n"),
    "max - min, over the range of n normal values (Wan et al. 2014)",
    _WIDTH_ALONE,
    lambda arm: recover.sd_from_range(0.0, arm.spread, arm.n),
    lambda arm: spread_given(arm) & ~given(arm.q1, arm.q3) & ~given(arm.min, arm.max),
)

BY_QUARTILES: tuple[Conversion[ArmNumbers], ...] = (_FIVE, _QUARTILES, _RANGE, _QUARTILE_WIDTH)
BY_RANGE: tuple[Conversion[ArmNumbers], ...] = (_FIVE, _QUARTILES, _RANGE, _RANGE_WIDTH)
