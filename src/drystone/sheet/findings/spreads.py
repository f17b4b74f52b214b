"""The SD of every arm: typed or converted, and what stands in the way."""

from __future__ import annotations

from collections.abc import Callable, Iterator

import numpy as np

from drystone.sheet.draft import Draft, Texts, blank_numbers, where
from drystone.sheet.findings.centres import settle_centres
from drystone.sheet.findings.own_spreads import NO_SD, find_own
from drystone.sheet.findings.pooled_spreads import fill_pooled
from drystone.sheet.notes import Note
from drystone.words import arms, levels


def find_sds(draft: Draft) -> Iterator[Note]:
    """Set the SD to use for both arms, with derivations of converted ones.

    An arm's own SD first, then one that both arms share; last, means and SDs of logarithms become
    those of the values.
    """
    notes = [note for step in _STEPS for note in step(draft)]
    yield from (note for note in notes if not _taken_back(draft, note))
    _forget_unused(draft)


def _confidence(draft: Draft) -> Iterator[Note]:
    percent = draft.number("confidence_percent")
    odd = ~np.isnan(percent) & ~((percent >= 50) & (percent < 100))
    yield from draft.notes(
        levels.ASK,
        "confidence level",
        "confidence_percent",
        where(odd),
        "the level of an interval lies between 50 and 100; spreads that need it are not used, "
        f"and {NO_SD}",
        "type 95 for a 95 % interval, or for an LSD at 0.05",
    )


def _negative(draft: Draft, arm: str) -> Iterator[Note]:
    for what in ("sd", "spread"):
        column = f"{arm}_{what}"
        yield from draft.notes(
            levels.STOP,
            "negative spread",
            column,
            where(draft.number(column) < 0),
            "a spread cannot be negative",
            "look for a typing error, or a value meant for another column",
        )


def _single(draft: Draft, arm: str) -> Iterator[Note]:
    n = draft.number(f"{arm}_n")
    single = (n >= 1) & (n < 2)
    for what in ("sd", "spread", "lower", "q1", "min"):
        column = f"{arm}_{what}"
        yield from draft.notes(
            levels.WARN,
            "spread of one value",
            column,
            where(single & ~np.isnan(draft.number(column))),
            "n is 1, and one value has no spread; it counts as missing",
            "check n and what the spread belongs to",
        )


def _zero(draft: Draft, arm: str) -> Iterator[Note]:
    sds, rules = draft.sds[arm], draft.sd_rules[arm]
    other = draft.sds[arms.TREATMENT if arm == arms.CONTROL else arms.CONTROL]
    zero = sds == 0
    kept = zero & (other > 0) if draft.settings.zero_sd == "as typed" else np.zeros_like(zero)
    for mask, level, effect in (
        (zero & ~kept, levels.ASK, "it counts as missing until somebody decides"),
        (kept, levels.WARN, "it is kept, as 'zero_sd' in the config asks"),
    ):
        for row in where(mask):
            column = _origin(draft, arm, row, rules)
            wrong = f"the spread is zero, which is rounding or one repeated value; {effect}"
            todo = "check the paper; leave the cell blank when no spread is given"
            yield draft.note(level, "zero spread", column, row, wrong, todo)
    gone = zero & ~kept
    sds[gone], rules[gone] = np.nan, None
    rules[kept] = "as typed"  # zero is zero in every kind of spread, so nothing was computed


def _origin(draft: Draft, arm: str, row: int, rules: Texts) -> str:
    if not np.isnan(draft.number(f"{arm}_sd")[row]):
        return f"{arm}_sd"
    return f"{arm}_lower" if str(rules[row]).startswith("from CI limits") else f"{arm}_spread"


def _forget_unused(draft: Draft) -> None:
    """Blank a level that no interval can have, so that the table holds allowed values only."""
    percent = draft.number("confidence_percent")
    percent[percent < 1] = blank_numbers(1)[0]


def _taken_back(draft: Draft, note: Note) -> bool:
    """Whether a note tells of an SD of logarithms that was not used after all."""
    if note.level != levels.FIXED or note.row is None or not note.rule.startswith("SD "):
        return False
    of_arm = [arm for arm in arms.ARMS if note.column.startswith(f"{arm}_")] or list(arms.ARMS)
    return bool(all(np.isnan(draft.sds[arm][note.row]) for arm in of_arm))


def _each_arm(
    *steps: Callable[[Draft, str], Iterator[Note]],
) -> Callable[[Draft], Iterator[Note]]:
    def both(draft: Draft) -> Iterator[Note]:
        for arm in arms.ARMS:
            for step in steps:
                yield from step(draft, arm)

    return both


_STEPS: tuple[Callable[[Draft], Iterator[Note]], ...] = (
    _confidence,
    _each_arm(_negative, _single, find_own),
    _each_arm(_zero),
    fill_pooled,
    settle_centres,
)
