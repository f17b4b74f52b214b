"""Outcomes of one trial that are the sum of two others: a total beside its parts."""

from __future__ import annotations

from collections.abc import Iterator
from itertools import combinations

import numpy as np

from drystone.sheet.draft import Draft
from drystone.sheet.findings.groups import names_of, rows_by
from drystone.sheet.notes import Note
from drystone.sheet.rounding import half_unit, significant_digits
from drystone.words import arms, levels

SAME_PLOTS = ["study", "site", "trial", "date", "species", "control_label", "treatment_label"]
WITHIN = 0.01
MOST_ROWS = 24  # of one group; more are no parts and total


def sums_of_outcomes(draft: Draft) -> Iterator[Note]:
    """Ask once for each outcome of a study that is the sum of two others in both arms."""
    told: set[tuple[object, ...]] = set()
    for rows in rows_by(draft, SAME_PLOTS).values():
        if not 3 <= len(rows) <= MOST_ROWS:
            continue
        for total, first, second in _triples(draft, rows):
            outcomes = draft.text("outcome")[[total, first, second]]
            key = (draft.text("study")[total], *outcomes)
            if key in told:
                continue
            told.add(key)
            yield draft.note(
                levels.ASK,
                "total and its parts",
                "outcome",
                total,
                f"'{outcomes[0]}' is the sum of '{outcomes[1]}' and '{outcomes[2]}' (rows "
                f"{names_of(draft, [first, second])}); all are used until somebody decides",
                "choose the level: analyse the total, or the parts, not both together",
            )


def _triples(draft: Draft, rows: list[int]) -> Iterator[tuple[int, int, int]]:
    outcomes, units = draft.text("outcome"), draft.text("unit")
    means = np.array([draft.number(f"{arm}_mean") for arm in arms.ARMS])
    usable = [row for row in rows if (means[:, row] > 0).all() and outcomes[row] is not None]
    for first, second in combinations(usable, 2):
        for total in usable:
            three = {outcomes[total], outcomes[first], outcomes[second]}
            same_unit = len({units[total], units[first], units[second]}) == 1
            if len(three) == 3 and same_unit and _adds_up(means, total, first, second):
                yield total, first, second


def _adds_up(means: np.ndarray, total: int, first: int, second: int) -> bool:
    for of_arm in means:
        whole, parts = float(of_arm[total]), float(of_arm[first] + of_arm[second])
        room = max(WITHIN * whole, half_unit(whole))
        if significant_digits(whole) < 2 or abs(whole - parts) > room:
            return False
    return True
