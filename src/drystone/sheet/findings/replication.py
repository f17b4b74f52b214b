"""What n counts: ranges, totals of both arms, subsamples, dates."""

from __future__ import annotations

import re
from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, Floats
from drystone.sheet.findings.groups import open_rows, rows_by
from drystone.sheet.headers import plain
from drystone.sheet.notes import Note
from drystone.sheet.raw import Cell
from drystone.words import arms, levels

COUNTS = frozenset(f"{arm}_n" for arm in arms.ARMS)
LARGEST_RANGE = 500
MANY, FOLD, FEW = 30, 5, 12
FEWEST_ROWS = 4
TOTALS = frozenset({"n", "totaln", "ntotal", "ntot", "samplesize", "totalsamplesize", "nall"})
_RANGE = re.compile(r"(?:n ?= ?)?(\d{1,3}) ?(?:-|–|—|to|or|and|/) ?(\d{1,3})", re.IGNORECASE)
_LEAST = re.compile(r"(?:n ?)?(?:>=|≥|≧|at least|min\.?|minimum) ?(\d{1,3})", re.IGNORECASE)
_MORE = re.compile(r"(?:n ?)?> ?(\d{1,3})", re.IGNORECASE)
SERIAL_DATES = (25_569, 54_788)  # 1970 to 2049 as a spreadsheet counts days


def lower_bound(cell: Cell) -> int | None:
    """Smallest n that a cell such as "3-5", ">=4" or "n = 4 or 5" allows; None for others.

    Examples
    --------
    >>> lower_bound("3-5"), lower_bound(">=4"), lower_bound("3-5-2020")
    (3, 4, None)
    """
    if not isinstance(cell, str) or len(cell) > 30:
        return None
    text = " ".join(cell.split())
    if found := _RANGE.fullmatch(text):
        low, high = int(found[1]), int(found[2])
        return low if 1 <= low < high <= LARGEST_RANGE else None
    if found := _LEAST.fullmatch(text):
        return int(found[1]) or None
    if found := _MORE.fullmatch(text):
        return int(found[1]) + 1
    return None


def read_ranges(
    draft: Draft, name: str, cells: list[Cell], values: Floats, wrongs: dict[int, str]
) -> Iterator[Note]:
    """Put the lower end of an n that is typed as a range into ``values``, and ask about it."""
    for row in list(wrongs):
        low = lower_bound(cells[row])
        if low is None:
            continue
        values[row] = low
        del wrongs[row]
        yield draft.note(
            levels.ASK,
            "n as a range",
            name,
            row,
            f"n is a range; its lower end, {low}, is used until somebody decides",
            "type the number of replicates of this arm",
        )


def odd_counts(draft: Draft) -> Iterator[Note]:
    """Ask about n that looks like a total, a number of subsamples, or a date."""
    yield from _dates(draft)
    yield from _typed_totals(draft)
    for rows in rows_by(draft, ["study", "outcome"]).values():
        yield from _doubled(draft, rows)
        yield from _subsamples(draft, rows)


def _dates(draft: Draft) -> Iterator[Note]:
    first, last = SERIAL_DATES
    for arm in arms.ARMS:
        n = draft.number(f"{arm}_n")
        rows = [row for row in open_rows(draft) if first <= n[row] <= last and n[row] % 1 == 0]
        yield from draft.notes(
            levels.ASK,
            "n looks like a date",
            f"{arm}_n",
            rows,
            "n is a number as a spreadsheet writes dates (a range such as 3-5 turned into one?); "
            "it is used as typed until somebody decides",
            "type the number of replicates",
        )


def _typed_totals(draft: Draft) -> Iterator[Note]:
    control, treatment = (draft.number(f"{arm}_n") for arm in arms.ARMS)
    for name in draft.extras:
        if plain(name) not in TOTALS or name not in draft.numbers:
            continue
        total = draft.number(name)
        same = (control == treatment) & (control == total) & (control > 1)
        for row in open_rows(draft):
            if same[row]:
                yield _total(draft, row, f"n of both arms equals '{name}'")


def _doubled(draft: Draft, rows: list[int]) -> Iterator[Note]:
    """Rows whose n, the same in both arms, is the sum of both n of every other row."""
    control, treatment = (draft.number(f"{arm}_n")[rows] for arm in arms.ARMS)
    sums = control + treatment
    for at, row in enumerate(rows):
        others = np.delete(sums, at)
        if len(rows) < FEWEST_ROWS or not control[at] == treatment[at] > 3:
            continue
        if (others == control[at]).all():
            yield _total(draft, row, "n of both arms is what the other rows have in both together")


def _total(draft: Draft, row: int, wrong: str) -> Note:
    return draft.note(
        levels.ASK,
        "n may be the total",
        "control_n",
        row,
        f"{wrong}, so it may be the total; it is used as typed until somebody decides",
        "type the number of replicates of each arm",
    )


def _subsamples(draft: Draft, rows: list[int]) -> Iterator[Note]:
    """Once for a study: n far above the other n and a multiple of them, as plots x samples."""
    places = [
        (float(draft.number(f"{arm}_n")[row]), arm, row)
        for row in rows
        for arm in arms.ARMS
        if draft.number(f"{arm}_n")[row] >= 1 and not draft.typed(f"{arm}_n_meaning", row).strip()
    ]
    if "n_meaning" in draft.settings.defaults.model_fields_set or not places:
        return
    least = min(n for n, _, _ in places)
    high = [place for place in places if place[0] > MANY and place[0] >= FOLD * least]
    low = {n for n, _, _ in places if n <= MANY}
    if not high or not low or max(low) > FEW or any(n % least for n, _, _ in high) or least < 2:
        return
    n, arm, row = high[0]
    yield draft.note(
        levels.ASK,
        "n may count subsamples",
        f"{arm}_n",
        row,
        f"n is {n:g} here and {least:g} elsewhere in the study, as when samples within plots were "
        "counted; it is used as typed until somebody decides",
        f"type the number of replicates, or say in {arm}_n_meaning what n counts",
    )
