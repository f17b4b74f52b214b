"""Sentences written from numbers. Pure functions: same numbers, same words."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import pandas as pd

from drystone.report import numbers
from drystone.report.facts import records
from drystone.settings.model import Strategy
from drystone.words import strategies

SIZE_FACTOR = 1.5  # common practice, no source: a change of size that a reader would call one


@dataclass(frozen=True)
class StrategyEstimate:
    """Overall effect under one strategy, on the log scale; NaN when ``refused``."""

    strategy: str
    estimate: float
    low: float
    high: float
    refused: str = ""

    @property
    def sign(self) -> str:
        """Word for the sign."""
        return "positive" if self.estimate > 0 else "negative" if self.estimate < 0 else "zero"

    @property
    def excludes_zero(self) -> bool:
        """Whether the interval lies on one side of zero."""
        return self.low > 0 or self.high < 0


@dataclass(frozen=True)
class Verdict:
    """Whether the answer holds over the strategies: ``holds`` is None when nothing can be said."""

    holds: bool | None
    sentences: tuple[str, ...]


def verdict(estimates: Sequence[StrategyEstimate], confidence_percent: float) -> Verdict:
    """Whether sign, interval and size hold over the strategies."""
    known = [item for item in estimates if not item.refused and not math.isnan(item.estimate)]
    refused = tuple(
        f"No result under {item.strategy}: {_full_stop(item.refused or 'no estimate')}"
        for item in estimates
        if item not in known
    )
    if not known:
        return Verdict(None, ("No strategy gave an overall effect.", *refused))
    if len(known) == 1:
        alone = f"Only {known[0].strategy} gave a result, so there is nothing to compare it with."
        return Verdict(None, (alone, *refused))
    parts = [_sign(known), _interval(known, confidence_percent), _size(known)]
    failing = tuple(sentence for holds, sentence in parts if not holds)
    if failing:
        holding = tuple(sentence for holds, sentence in parts if holds)
        return Verdict(False, (*failing, *holding, *refused))
    return Verdict(True, (_all_hold(known, confidence_percent), *refused))


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
    """What the prediction interval is about."""
    if math.isnan(low) or math.isnan(high):
        return "No prediction interval: the fit does not give one."
    return (
        f"Prediction interval, {numbers.level_percent(confidence_percent)}: the ratio of a new "
        f"comparison in a new study is expected between {numbers.percent(low)} and "
        f"{numbers.percent(high)}."
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


def estimates_of(side_by_side: pd.DataFrame) -> list[StrategyEstimate]:
    """Rows of tables.results.SIDE_BY_SIDE as estimates; names tell the row set where needed."""
    return [
        StrategyEstimate(
            str(row["strategy"]),
            float(row["estimate"]),
            float(row["ci_low"]),
            float(row["ci_high"]),
            row["refused"] if isinstance(row["refused"], str) else "",
        )
        for row in records(side_by_side)
    ]


def _sign(known: Sequence[StrategyEstimate]) -> tuple[bool, str]:
    signs = list(dict.fromkeys(item.sign for item in known))
    if len(signs) == 1:
        return True, f"Every estimate is {signs[0]}."
    where = [f"{sign} under {_names(known, 'sign', sign)}" for sign in signs]
    return False, f"The sign does not hold: {'; '.join(where)}."


def _interval(known: Sequence[StrategyEstimate], confidence_percent: float) -> tuple[bool, str]:
    level = numbers.level_percent(confidence_percent)
    if all(item.excludes_zero for item in known):
        return True, f"Every {level} interval excludes zero."
    if not any(item.excludes_zero for item in known):
        return True, f"Every {level} interval includes zero."
    return False, (
        f"Whether the {level} interval excludes zero depends on the strategy: it does under "
        f"{_names(known, 'excludes_zero', True)}; it does not under "
        f"{_names(known, 'excludes_zero', False)}."
    )


def _size(known: Sequence[StrategyEstimate]) -> tuple[bool, str]:
    ordered = sorted(known, key=lambda item: abs(item.estimate))
    small, large = ordered[0], ordered[-1]
    factor = abs(large.estimate) / abs(small.estimate) if small.estimate else math.inf
    if large.estimate == 0 or (factor <= SIZE_FACTOR and small.sign == large.sign):
        return True, _range(known)
    times = f"{numbers.number(factor, 2)} times" if factor < 100 else "many times"
    return False, (
        f"The size does not hold: {numbers.percent(large.estimate)} under {large.strategy} is "
        f"{times} the {numbers.percent(small.estimate)} under {small.strategy}, measured on the "
        "log scale."
    )


def _range(known: Sequence[StrategyEstimate]) -> str:
    ordered = sorted(known, key=lambda item: item.estimate)
    low, high = numbers.percent(ordered[0].estimate), numbers.percent(ordered[-1].estimate)
    return f"Estimates are all {low}." if low == high else f"Estimates run from {low} to {high}."


def _all_hold(known: Sequence[StrategyEstimate], confidence_percent: float) -> str:
    parts = (_sign(known)[1], _interval(known, confidence_percent)[1], _range(known))
    return f"Sign, interval and size hold over {len(known)} strategies. {' '.join(parts)}"


def _names(known: Sequence[StrategyEstimate], what: str, value: object) -> str:
    return listed([item.strategy for item in known if getattr(item, what) == value])


def _full_stop(text: str) -> str:
    return text if text.endswith((".", "!", "?")) else text + "."
