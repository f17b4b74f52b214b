"""Names of rows: missing ones get a temporary name, repeated ones stop."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator

from drystone.sheet.draft import Draft, where
from drystone.sheet.notes import Note
from drystone.words import levels


def check_row_ids(draft: Draft) -> Iterator[Note]:
    """Find repeated names, then name the rows that have none."""
    yield from _repeated(draft)
    blank = where(~draft.has_text("row_id"))
    if not blank:
        return
    _name(draft, blank)
    draft.unnamed.update(blank)
    first = blank[0]
    yield Note(
        levels.WARN,
        "missing row_id",
        f"{len(blank)} of {draft.size} rows have no row_id; they carry temporary names made from "
        "study, outcome, arms and date",
        "fill a row_id column with names that never change; an edition cannot be saved without",
        column="row_id",
        cell=draft.cell("row_id", first),
    )


def _repeated(draft: Draft) -> Iterator[Note]:
    rows_of: dict[str, list[int]] = defaultdict(list)
    for row, name in enumerate(draft.text("row_id")):
        if name is not None:
            rows_of[name].append(row)
    for name, rows in rows_of.items():
        if len(rows) == 1:
            continue
        first = draft.cell("row_id", rows[0])
        for row in rows[1:]:
            yield draft.note(
                levels.STOP,
                "repeated row_id",
                "row_id",
                row,
                f"row_id '{name}' stands in {first} and in {draft.cell('row_id', row)}; all "
                f"{len(rows)} rows with it leave, since nobody can tell which is meant",
                "give each row a name of its own",
                leaves=(rows[0],),
            )


def _name(draft: Draft, rows: list[int]) -> None:
    """Give temporary names; rows that would share one are counted in sheet order."""
    names = draft.text("row_id")
    used = {name for name in names if name is not None}
    counts: Counter[str] = Counter()
    for row in rows:
        base = " | ".join(_parts(draft, row)) or "row"
        while True:
            counts[base] += 1
            name = base if counts[base] == 1 else f"{base} #{counts[base]}"
            if name not in used:
                break
        names[row] = name
        used.add(name)


def _parts(draft: Draft, row: int) -> list[str]:
    found = [draft.text("study")[row], draft.text("outcome")[row]]
    for arm in ("control", "treatment"):
        found.append(draft.text(f"{arm}_id")[row] or draft.text(f"{arm}_label")[row])
    found.append(draft.text("date")[row])
    return [part for part in found if part is not None]
