"""Whether the answer holds over the strategies.

Sign and interval are compared over the strategies that the config declares, size over those that
stand on the same rows: a strategy that drops rows and one that keeps them differ by rows and by
weights. So sizes are first compared where the rows are the same, with the all-cases strategies on
complete rows as partners, and what is left between the row sets is said apart.
"""

from __future__ import annotations

import math
from collections.abc import Collection, Sequence
from dataclasses import dataclass

import pandas as pd

from drystone.report import numbers
from drystone.report.facts import records
from drystone.report.sentences import listed
from drystone.words import strategies

SIZE_FACTOR = 1.5  # common practice, no source: a change of size that a reader would call one
FACTOR_WORDS = (
    f"Sizes count as equal up to a factor of {SIZE_FACTOR:g} on the log scale (common practice, no "
    "source)."
)
ROW_SET_WORDS = {
    strategies.ALL_ROWS: "all usable rows",
    strategies.COMPLETE_ROWS: "rows with both SDs",
}


@dataclass(frozen=True)
class StrategyEstimate:
    """Overall effect under one strategy, on the log scale; NaN when ``refused``.

    ``rows`` and ``row_set`` say on which rows it stands, ``declared`` whether the config names it
    (a partner on complete rows stands beside it without being named).
    """

    strategy: str
    estimate: float
    low: float
    high: float
    refused: str = ""
    row_set: str = "all usable rows"
    rows: int = 0
    declared: bool = True

    @property
    def sign(self) -> str:
        """Word for the sign."""
        return "positive" if self.estimate > 0 else "negative" if self.estimate < 0 else "zero"

    @property
    def excludes_zero(self) -> bool:
        """Whether the interval lies on one side of zero."""
        return self.low > 0 or self.high < 0

    @property
    def known(self) -> bool:
        """Whether there is an estimate."""
        return not self.refused and not math.isnan(self.estimate)


@dataclass(frozen=True)
class Verdict:
    """Whether the answer holds over the strategies: ``holds`` is None when nothing can be said."""

    holds: bool | None
    sentences: tuple[str, ...]


def verdict(estimates: Sequence[StrategyEstimate], confidence_percent: float) -> Verdict:
    """Whether sign, interval and size hold over the declared strategies."""
    declared = [item for item in estimates if item.declared]
    known = [item for item in declared if item.known]
    refused = _refused([item for item in declared if not item.known])
    if not known:
        return Verdict(None, ("No strategy gave an overall effect.", *refused))
    if len(known) == 1:
        alone = f"Only {known[0].strategy} gave a result, so there is nothing to compare it with."
        return Verdict(None, (alone, *refused))
    parts = [_sign(known), _interval(known, confidence_percent), _size(known, estimates)]
    failing = tuple(sentence for holds, sentence in parts if not holds)
    holding = tuple(sentence for holds, sentence in parts if holds)
    if failing:
        return Verdict(False, (*failing, *holding, FACTOR_WORDS, *refused))
    return Verdict(True, (_all_hold(len(known), len(declared)), *holding, FACTOR_WORDS, *refused))


def estimates_of(side_by_side: pd.DataFrame, declared: Collection[str]) -> list[StrategyEstimate]:
    """Rows of tables.results.SIDE_BY_SIDE as estimates.

    Parameters
    ----------
    side_by_side : one row for each strategy
    declared : names of the strategies that the config names
    """
    return [
        StrategyEstimate(
            str(row["strategy"]),
            float(row["estimate"]),
            float(row["ci_low"]),
            float(row["ci_high"]),
            row["refused"] if isinstance(row["refused"], str) else "",
            ROW_SET_WORDS.get(str(row["row_set"]), str(row["row_set"])),
            int(row["rows"]),
            str(row["strategy"]) in declared,
        )
        for row in records(side_by_side)
    ]


def _refused(items: Sequence[StrategyEstimate]) -> tuple[str, ...]:
    by_reason: dict[str, list[str]] = {}
    for item in items:
        by_reason.setdefault(item.refused or "no estimate", []).append(item.strategy)
    return tuple(
        f"No result under {listed(names)}: {reason.rstrip('.')}."
        for reason, names in by_reason.items()
    )


def _all_hold(known: int, declared: int) -> str:
    if known == declared:
        return f"Sign, interval and size hold over the {known} strategies."
    return f"Sign, interval and size hold over the {known} of {declared} strategies with a result."


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


def _size(
    known: Sequence[StrategyEstimate], estimates: Sequence[StrategyEstimate]
) -> tuple[bool, str]:
    """Size on like rows first, then between the row sets, which is about rows."""
    groups = _like_rows([item for item in estimates if item.known])
    apart = [text for group in groups if (text := _apart(group))]
    if apart:
        return False, " ".join(f"The size does not hold: {text}" for text in apart)
    between = _apart(known)
    if not between:
        return True, _range(known)
    return False, f"The size does not hold between row sets: {between} {_about_rows(groups)}"


def _like_rows(known: Sequence[StrategyEstimate]) -> list[list[StrategyEstimate]]:
    """Estimates that stand on the same rows.

    Complete rows are part of all usable rows, so two sets of one size are one set.
    """
    groups: dict[int, list[StrategyEstimate]] = {}
    for item in known:
        groups.setdefault(item.rows, []).append(item)
    return list(groups.values())


def _about_rows(groups: Sequence[Sequence[StrategyEstimate]]) -> str:
    compared = [group for group in groups if len(group) > 1]
    if len(compared) == len(groups):
        return "Where the rows are the same the size holds, so the rows make the difference."
    return (
        "No two strategies stand on each of these row sets, so rows and strategy cannot be told "
        "apart here."
    )


def _apart(items: Sequence[StrategyEstimate]) -> str:
    """Sentence about the largest and the smallest size when they differ by more than the factor."""
    ordered = sorted(items, key=lambda item: abs(item.estimate))
    small, large = ordered[0], ordered[-1]
    factor = abs(large.estimate) / abs(small.estimate) if small.estimate else math.inf
    if large.estimate == 0 or (factor <= SIZE_FACTOR and small.sign == large.sign):
        return ""
    first, second = (_placed(item, small.rows != large.rows) for item in (large, small))
    if small.sign != large.sign:
        return f"{first} stands against {second}."
    times = f"{numbers.number(factor, 2)} times" if factor < 100 else "many times"
    return f"{first} is {times} the {second}, measured on the log scale."


def _placed(item: StrategyEstimate, with_rows: bool) -> str:
    rows = f" on {item.row_set}" if with_rows else ""
    return f"{numbers.percent(item.estimate)} under {item.strategy}{rows}"


def _range(known: Sequence[StrategyEstimate]) -> str:
    ordered = sorted(known, key=lambda item: item.estimate)
    low, high = numbers.percent(ordered[0].estimate), numbers.percent(ordered[-1].estimate)
    return f"Estimates are all {low}." if low == high else f"Estimates run from {low} to {high}."


def _names(known: Sequence[StrategyEstimate], what: str, value: object) -> str:
    return listed([item.strategy for item in known if getattr(item, what) == value])
