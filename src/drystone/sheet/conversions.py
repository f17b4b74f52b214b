"""Spreads of one arm that become its SD: which cells go in, which formula, which assumption.

A new kind is one more `Conversion` in `BY_KIND`, with its formula in `maths.spread_recovery`.
Spreads of both arms together stand in `pooled_conversions`.
"""

from __future__ import annotations

import numpy as np

from drystone.maths import spread_recovery as recover
from drystone.sheet.conversion import (
    ArmNumbers,
    Conversion,
    Mask,
    Refusals,
    given,
    spread_given,
    usable_level,
)
from drystone.sheet.quantile_conversions import BY_QUARTILES, BY_RANGE
from drystone.sheet.rounding import half_unit
from drystone.words import spreads

MOST_ASYMMETRY = 0.05  # share of the width


def _limits_given(arm: ArmNumbers) -> Mask:
    return given(arm.lower, arm.upper)


def _half_width_given(arm: ArmNumbers) -> Mask:
    return spread_given(arm) & ~_limits_given(arm)


def _limits_refused(arm: ArmNumbers) -> Refusals:
    yield "the level of the interval is unusable", ~usable_level(arm)
    yield "the lower limit is not below the upper limit", ~(arm.lower < arm.upper)
    yield (
        "the limits lie unevenly about the mean (by more than 5 % of their width, rounding "
        "apart), as after a transformation",
        _uneven(arm),
    )


def _log_limits_refused(arm: ArmNumbers) -> Refusals:
    yield "the level of the interval is unusable", ~usable_level(arm)
    yield "the lower limit is not below the upper limit", ~(arm.lower < arm.upper)
    yield "a limit of a geometric mean is not above zero", ~((arm.lower > 0) & (arm.mean > 0))
    yield (
        "the limits lie unevenly about the geometric mean even on the log scale (by more than 5 % "
        "of their width, rounding apart)",
        _uneven_logs(arm),
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


def _uneven_logs(arm: ArmNumbers) -> Mask:
    """`_uneven` on the log scale, where rounding counts by its share of each number."""
    possible = (arm.lower > 0) & (arm.mean > 0) & (arm.upper > arm.lower)
    logs = [np.log(np.where(possible, part, 1.0)) for part in (arm.mean, arm.lower, arm.upper)]
    skew = recover.limit_asymmetry(*logs)
    uneven = np.asarray(possible & (skew > MOST_ASYMMETRY))
    for row in np.flatnonzero(uneven & (skew <= 2 * MOST_ASYMMETRY)):
        numbers = (arm.mean[row], arm.lower[row], arm.upper[row])
        shares = [half_unit(number) / number for number in numbers]
        room = (2 * shares[0] + shares[1] + shares[2]) / (logs[2][row] - logs[1][row])
        uneven[row] = skew[row] > MOST_ASYMMETRY + room
    return uneven


def _half_width_refused(arm: ArmNumbers) -> Refusals:
    yield "the level of the interval is unusable", ~usable_level(arm)


_BY_T = "the interval is mean +- t(n - 1) SE, of one arm, on the scale of the mean"
_BY_Z = "the interval is mean +- z SE, of one arm, on the scale of the mean"
_LIMITS = ("lower", "upper", "n", "confidence_percent")
_HALF = ("spread", "n", "confidence_percent")

_SD = Conversion(
    "as typed", ("spread",), "the spread itself", "", lambda arm: arm.spread, spread_given
)
_SE = Conversion(
    "from SE",
    ("spread", "n"),
    "SE x sqrt(n)",
    "the SE belongs to this arm alone and n is the number behind it",
    lambda arm: recover.sd_from_se(arm.spread, arm.n),
    spread_given,
)
_VARIANCE = Conversion(
    "from variance",
    ("spread",),
    "square root of the variance",
    "the variance is that of replicates, not of the mean",
    lambda arm: recover.sd_from_variance(arm.spread),
    spread_given,
)
_CV = Conversion(
    "from CV%",
    ("spread", "mean"),
    "CV% x mean / 100",
    "the CV% belongs to this arm's own mean, not to the grand mean of a table",
    lambda arm: recover.sd_from_cv_percent(arm.spread, arm.mean),
    spread_given,
)
_LIMITS_BY_T = Conversion(
    "from CI limits",
    _LIMITS,
    "sqrt(n) x (upper - lower) / (2 t(n - 1))",
    _BY_T,
    lambda arm: recover.sd_from_limits(arm.lower, arm.upper, arm.n, arm.confidence_percent),
    _limits_given,
    _limits_refused,
)
_HALF_BY_T = Conversion(
    "from CI half width",
    _HALF,
    "sqrt(n) x half width / t(n - 1)",
    _BY_T + "; the spread is half its width",
    lambda arm: recover.sd_from_half_width(arm.spread, arm.n, arm.confidence_percent),
    _half_width_given,
    _half_width_refused,
)
_LIMITS_BY_Z = Conversion(
    "from CI limits by z",
    _LIMITS,
    "sqrt(n) x (upper - lower) / (2 z)",
    _BY_Z,
    lambda arm: recover.sd_from_limits_by_z(arm.lower, arm.upper, arm.n, arm.confidence_percent),
    _limits_given,
    _limits_refused,
)
_HALF_BY_Z = Conversion(
    "from CI half width by z",
    _HALF,
    "sqrt(n) x half width / z",
    _BY_Z + "; the spread is half its width",
    lambda arm: recover.sd_from_half_width_by_z(arm.spread, arm.n, arm.confidence_percent),
    _half_width_given,
    _half_width_refused,
)
_LIMITS_OF_GEOMETRIC_MEAN = Conversion(
    "from CI limits of a geometric mean",
    _LIMITS,
    "sqrt(n) x (ln upper - ln lower) / (2 t(n - 1)), an SD of natural logarithms",
    "the interval is exp(mean of logs +- t(n - 1) SE), of one arm",
    lambda arm: recover.log_sd_from_limits(arm.lower, arm.upper, arm.n, arm.confidence_percent),
    _limits_given,
    _log_limits_refused,
    of_geometric_mean=True,
)

BY_KIND: dict[str, tuple[Conversion[ArmNumbers], ...]] = {
    spreads.SD: (_SD,),
    spreads.SE: (_SE,),
    spreads.VARIANCE: (_VARIANCE,),
    spreads.CV_PERCENT: (_CV,),
    spreads.CI: (_LIMITS_OF_GEOMETRIC_MEAN, _LIMITS_BY_T, _HALF_BY_T),
    spreads.CI_BY_Z: (_LIMITS_BY_Z, _HALF_BY_Z),
    spreads.IQR: BY_QUARTILES,
    spreads.RANGE: BY_RANGE,
}
"""Conversions by kind of spread; an earlier one of a kind goes before a later one."""
