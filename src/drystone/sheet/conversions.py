"""Spread kinds that become an SD: which cells go in, which formula, which assumption.

A new kind is one more `Conversion` in `BY_KIND`, with its formula in `maths.spread_recovery`.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from drystone.maths import spread_recovery as recover
from drystone.sheet.rounding import half_unit
from drystone.words import spreads

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]
MOST_ASYMMETRY = 0.05  # share of the width


@dataclass(frozen=True)
class ArmNumbers:
    """Numbers of one arm, an entry for every row; NaN where missing."""

    mean: Floats
    n: Floats
    spread: Floats
    lower: Floats
    upper: Floats
    confidence_percent: Floats


Refusals = Iterator[tuple[str, Mask]]


def _spread_given(arm: ArmNumbers) -> Mask:
    return ~np.isnan(arm.spread) & (arm.spread >= 0)


def _never_refused(arm: ArmNumbers) -> Refusals:
    yield from ()


@dataclass(frozen=True)
class Conversion:
    """One way from a typed spread to an SD.

    Parameters
    ----------
    rule : name in derivations and in the rows' SD rule
    inputs : columns that go in, without the arm's name; findings point to the first
    formula, assumption : in words
    convert : the formula, for all rows at once
    given : rows that have the inputs
    refused : reasons not to convert, with the rows that they hold for
    """

    rule: str
    inputs: tuple[str, ...]
    formula: str
    assumption: str
    convert: Callable[[ArmNumbers], Floats]
    given: Callable[[ArmNumbers], Mask] = _spread_given
    refused: Callable[[ArmNumbers], Refusals] = _never_refused


def _limits_given(arm: ArmNumbers) -> Mask:
    return ~np.isnan(arm.lower) & ~np.isnan(arm.upper)


def _limits_refused(arm: ArmNumbers) -> Refusals:
    yield "the level of the interval is unusable", ~_usable_level(arm)
    yield "the lower limit is not below the upper limit", ~(arm.lower < arm.upper)
    yield (
        "the limits lie unevenly about the mean (by more than 5 % of their width, rounding "
        "apart), as after a transformation",
        _uneven(arm),
    )


def _uneven(arm: ArmNumbers) -> Mask:
    """Whether limits are not centred; rounded ones may be off by up to as much again."""
    skew = recover.limit_asymmetry(arm.mean, arm.lower, arm.upper)
    uneven = np.asarray(skew > MOST_ASYMMETRY)
    for row in np.flatnonzero(uneven & (skew <= 2 * MOST_ASYMMETRY)):
        numbers = (arm.mean[row], arm.lower[row], arm.upper[row])
        room = 4 * min(half_unit(number) for number in numbers)  # twice the mean, each limit once
        uneven[row] = skew[row] > MOST_ASYMMETRY + room / (numbers[2] - numbers[1])
    return uneven


def _half_width_refused(arm: ArmNumbers) -> Refusals:
    yield "the level of the interval is unusable", ~_usable_level(arm)


def _usable_level(arm: ArmNumbers) -> Mask:
    return (arm.confidence_percent >= 50) & (arm.confidence_percent < 100)


_NORMAL = "the interval is mean +- t(n - 1) SE, of one arm, on the scale of the mean"

BY_KIND: dict[str, tuple[Conversion, ...]] = {
    spreads.SD: (
        Conversion("as typed", ("spread",), "the spread itself", "", lambda arm: arm.spread),
    ),
    spreads.SE: (
        Conversion(
            "from SE",
            ("spread", "n"),
            "SE x sqrt(n)",
            "the SE belongs to this arm alone and n is the number behind it",
            lambda arm: recover.sd_from_se(arm.spread, arm.n),
        ),
    ),
    spreads.VARIANCE: (
        Conversion(
            "from variance",
            ("spread",),
            "square root of the variance",
            "the variance is that of replicates, not of the mean",
            lambda arm: recover.sd_from_variance(arm.spread),
        ),
    ),
    spreads.CV_PERCENT: (
        Conversion(
            "from CV%",
            ("spread", "mean"),
            "CV% x mean / 100",
            "the CV% belongs to this arm's own mean, not to the grand mean of a table",
            lambda arm: recover.sd_from_cv_percent(arm.spread, arm.mean),
        ),
    ),
    spreads.CI: (
        Conversion(
            "from CI limits",
            ("lower", "upper", "n", "confidence_percent"),
            "sqrt(n) x (upper - lower) / (2 t(n - 1))",
            _NORMAL,
            lambda arm: recover.sd_from_limits(arm.lower, arm.upper, arm.n, arm.confidence_percent),
            _limits_given,
            _limits_refused,
        ),
        Conversion(
            "from CI half width",
            ("spread", "n", "confidence_percent"),
            "sqrt(n) x half width / t(n - 1)",
            _NORMAL + "; the spread is half its width",
            lambda arm: recover.sd_from_half_width(arm.spread, arm.n, arm.confidence_percent),
            lambda arm: _spread_given(arm) & ~_limits_given(arm),
            _half_width_refused,
        ),
    ),
}
"""Conversions by kind of spread; an earlier one of a kind goes before a later one."""
