"""Which row of one extraction is which row of the other."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Callable, Iterable

import numpy as np
import pandas as pd

from drystone.sheet.intake import Intake
from drystone.words import arms

NAMES = (
    *("study", "outcome", "species", "site", "trial", "date"),
    *("control_id", "treatment_id", "control_label", "treatment_label"),
)
NUMBERS = tuple(f"{arm}_{what}" for arm in arms.ARMS for what in ("mean", "n", "sd_value"))
ALIKE = 2  # equal numbers that make two rows of a study the same although a name differs

Pair = tuple[int, int]
Key = Callable[[pd.DataFrame, int], tuple[str, ...] | None]


def match_rows(first: Intake, second: Intake) -> list[Pair]:
    """Pairs of row places: by row_id, then by all names, then by study, outcome and numbers."""
    a, b = first.rows, second.rows
    shared = [name for name in NAMES if name in first.columns and name in second.columns]
    names = list(dict.fromkeys(["study", "outcome", *shared]))
    pairs: list[Pair] = []
    pairs += _pair(_typed(first), _typed(second), pairs, _key(["row_id"]), 0)
    pairs += _pair(a, b, pairs, _key(names), 0)
    pairs += _pair(a, b, pairs, _key(["study", "outcome"]), ALIKE)
    return sorted(pairs)


def _typed(intake: Intake) -> pd.DataFrame:
    """Rows without temporary names, which say nothing about another sheet."""
    rows = intake.rows
    return rows.assign(row_id=rows["row_id"].mask(rows.index.isin(list(intake.unnamed))))


def same_text(value: object) -> str:
    """Text without case and spacing; blank when missing."""
    return "" if value is None or value != value else " ".join(str(value).split()).casefold()


def _key(names: list[str]) -> Key:
    def of_row(rows: pd.DataFrame, place: int) -> tuple[str, ...] | None:
        found = tuple(same_text(rows[name].iloc[place]) for name in names)
        return found if found[0] else None

    return of_row


def _pair(a: pd.DataFrame, b: pd.DataFrame, done: list[Pair], key: Key, least: int) -> list[Pair]:
    """Pair what is left, within equal keys; rows with most equal numbers first."""
    left = _groups(a, {i for i, _ in done}, key)
    right = _groups(b, {j for _, j in done}, key)
    found: list[Pair] = []
    for name in left.keys() & right.keys():
        scored = sorted(
            ((_alike(a, b, i, j), -i, -j) for i in left[name] for j in right[name]), reverse=True
        )
        taken: tuple[set[int], set[int]] = (set(), set())
        for score, i, j in scored:
            if score >= least and -i not in taken[0] and -j not in taken[1]:
                taken[0].add(-i)
                taken[1].add(-j)
                found.append((-i, -j))
    return found


def _groups(rows: pd.DataFrame, done: Iterable[int], key: Key) -> dict[tuple[str, ...], list[int]]:
    groups: dict[tuple[str, ...], list[int]] = defaultdict(list)
    for place in range(len(rows)):
        name = None if place in done else key(rows, place)
        if name is not None:
            groups[name].append(place)
    return groups


def _alike(a: pd.DataFrame, b: pd.DataFrame, i: int, j: int) -> int:
    first = a[list(NUMBERS)].to_numpy(float)[i]
    second = b[list(NUMBERS)].to_numpy(float)[j]
    return int(np.sum(first == second))
