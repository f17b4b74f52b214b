"""Replicates: missing, below one, not whole; missing ones may borrow a stated number."""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, Mask, where
from drystone.sheet.notes import Note
from drystone.sheet.raw import show
from drystone.words import arms, levels

LEAVE = "leave"
STUDY_MINIMUM = "study minimum"


def check_counts(draft: Draft) -> Iterator[Note]:
    """Check n of both arms; fill missing ones when the config says how."""
    missing = {}
    for arm in arms.ARMS:
        column = f"{arm}_n"
        counts = draft.number(column)
        missing[arm] = np.isnan(counts) & ~draft.was_unreadable(column)
        yield from draft.notes(
            levels.STOP,
            "n below one",
            column,
            where(counts < 1),
            "n is below one",
            "type the number of replicates",
        )
        yield from draft.notes(
            levels.ASK,
            "n not whole",
            column,
            where((counts >= 1) & (counts != np.floor(counts))),
            "n is not a whole number; it is used as typed until somebody decides",
            "type the number of replicates of this arm, the smaller one when in doubt",
        )
    if draft.settings.missing_n == LEAVE:
        for arm in arms.ARMS:
            yield from _leave(draft, arm, missing[arm])
    else:
        yield from _borrow(draft, missing)


def _leave(draft: Draft, arm: str, rows: Mask, more: str = "") -> Iterator[Note]:
    yield from draft.notes(
        levels.STOP,
        "missing n",
        f"{arm}_n",
        where(rows),
        f"the {arm} arm has no n{more}",
        "type the number of replicates; 'missing_n' in the config can borrow one instead",
    )


def _borrow(draft: Draft, missing: dict[str, Mask]) -> Iterator[Note]:
    by_study = draft.settings.missing_n == STUDY_MINIMUM
    groups = draft.text("study" if by_study else "outcome")
    given = _given(draft, groups)
    for arm in arms.ARMS:
        column, rest = f"{arm}_n", missing[arm].copy()
        for row in where(missing[arm]):
            found = given.get(groups[row])
            if not found:
                continue
            value = min(found) if by_study else float(max(1, math.floor(np.median(found))))
            draft.number(column)[row] = value
            rest[row] = False
            origin = "smallest n of the study" if by_study else "median n of the outcome"
            yield draft.note(
                levels.FIXED,
                "borrowed n",
                column,
                row,
                f"the {arm} arm has no n; {show(float(value))}, the {origin}, stands in",
                "type the number of replicates when it can be had",
            )
        kind = "study" if by_study else "outcome"
        yield from _leave(draft, arm, rest, f" and its {kind} has none to lend")


def _given(draft: Draft, groups: np.ndarray) -> dict[str, list[float]]:
    given: dict[str, list[float]] = defaultdict(list)
    for arm in arms.ARMS:
        counts = draft.number(f"{arm}_n")
        for row in where(counts >= 1):
            if groups[row] is not None and row not in draft.left_out:
                given[groups[row]].append(float(counts[row]))
    return given
