"""Sentences written from numbers. Pure functions: same numbers, same words."""

from __future__ import annotations

import math
from collections.abc import Sequence

from drystone.report import numbers
from drystone.settings.model import Strategy
from drystone.words import strategies


def listed(words: Sequence[str], last: str = "and") -> str:
    """Words as a list in a sentence: 'a', 'a and b', 'a, b and c'."""
    words = list(words)
    if len(words) < 2:
        return "".join(words)
    return f"{', '.join(words[:-1])} {last} {words[-1]}"


def direction(estimate: float, low: float, high: float, confidence_percent: float) -> str:
    """What the overall effect says, without advice."""
    level = numbers.level_percent(confidence_percent)
    if math.isnan(estimate):
        return "There is no overall effect to report."
    side = "above" if estimate > 0 else "below"
    if low > 0 or high < 0:
        return f"The {level} interval lies wholly {side} zero change."
    return f"The {level} interval includes zero change, so the direction is not settled."


def prediction(low: float, high: float, confidence_percent: float) -> str:
    """What the prediction interval is about: a true ratio, not an observed one."""
    if math.isnan(low) or math.isnan(high):
        return "No prediction interval: the fit does not give one."
    return (
        f"Prediction interval, {numbers.level_percent(confidence_percent)}: the true ratio of a "
        "new comparison in a new study (without its sampling error) is expected between "
        f"{numbers.percent(low)} and {numbers.percent(high)}."
    )


def ratio_meaning(flipped: int, rows: int) -> str:
    """How the sign is to be read, when smaller is better for some or all rows."""
    if not flipped:
        return "A positive change means more of the outcome under treatment than under control."
    turned = "The sign is turned because smaller is better"
    read = "a positive change means less of the outcome under treatment (control over treatment)"
    if flipped == rows:
        return f"{turned}: {read}."
    return f"{turned} in {numbers.count(flipped, 'row')} of {numbers.whole(rows)}: there, {read}."


def strategy_gloss(settings: Strategy) -> str:
    """What a strategy does with missing spreads, in a few words."""
    return {
        strategies.COMPLETE_CASES: "rows that lack an SD are dropped",
        strategies.MISSING_CASES: "arms without SD borrow the average CV",
        strategies.ALL_CASES: "every arm uses the average CV",
    }[settings.use]


def filters(where: dict[str, tuple[str, ...]], where_not: dict[str, tuple[str, ...]]) -> str:
    """Filters of an analysis in words; blank without filters."""
    parts = [f"{name} is {listed(values, 'or')}" for name, values in where.items()]
    parts += [f"{name} is not {listed(values, 'or')}" for name, values in where_not.items()]
    return f"Only rows where {listed(parts)}." if parts else ""
