"""The studies table: typed, with a place for every study."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pandas as pd

from drystone.settings.problems import nearest
from drystone.sheet.draft import Draft
from drystone.sheet.headers import match_headers, require
from drystone.sheet.notes import Note
from drystone.sheet.parse import parse_number, parse_text
from drystone.sheet.raw import RawTable, show
from drystone.tables.store import conform, empty_table
from drystone.tables.studies import COLUMNS, SCHEMA, STATUSES
from drystone.words import levels


def open_studies(draft: Draft) -> list[Note]:
    """Type the studies table into ``draft.studies``.

    Raises
    ------
    SheetProblem
        When the table has no study column or an ambiguous header.
    """
    draft.studies = {name: [] for name in COLUMNS}
    table = draft.raw.studies
    if table is None:
        return []
    found = match_headers(table, list(COLUMNS), {}, draft.raw.file)
    require(table, found, ("study",), draft.raw.file)
    notes: list[Note] = []
    seen: dict[str, int] = {}
    for row in range(len(table.row_numbers)):
        study, _ = parse_text(table.columns[found["study"]][row])
        if study is None:
            notes.append(_note(table, found, "study", row, "no study name", *_NAMELESS))
        elif study in seen:
            first = table.address(found["study"], seen[study])
            wrong = f"'{study}' stands here again (first in {first}); the first row is used"
            notes.append(
                _note(table, found, "study", row, "repeated study", wrong, "keep one of them")
            )
        else:
            seen[study] = row
            notes.extend(_take(draft, table, found, row, study))
    return notes


def study_table(draft: Draft) -> pd.DataFrame:
    """One row = one study of the studies table; empty when there is none."""
    if not draft.studies["study"]:
        return empty_table(SCHEMA)
    kinds = {name: "float64" if name == "year" else "str" for name in COLUMNS}
    table = pd.DataFrame(
        {name: pd.Series(draft.studies[name], dtype=kinds[name]) for name in COLUMNS}
    )
    return conform(table, SCHEMA)


_NAMELESS = ("the study has no name; its row is ignored", "type the name used in the comparisons")


def _take(
    draft: Draft, table: RawTable, found: dict[str, int], row: int, study: str
) -> Iterator[Note]:
    for name in COLUMNS:
        value: Any = None
        if name == "study":
            value = study
        elif name in found:
            cell = table.columns[found[name]][row]
            if name == "year":
                value, wrong = parse_number(cell)
                if wrong:
                    yield _note(
                        table, found, name, row, "year", f"the year {wrong}", "type it as 2019"
                    )
            else:
                value, _ = parse_text(cell)
        if name == "status" and value is not None:
            value, wrong = _status(value)
            if wrong:
                yield _note(table, found, name, row, "unknown status", wrong, "type one of them")
        draft.studies[name].append(value)


def _status(value: str) -> tuple[str | None, str]:
    if value.casefold() in STATUSES:
        return value.casefold(), ""
    return None, f"'{value}' is no status, so the study stays in: {nearest(value, STATUSES)}"


def _note(
    table: RawTable, found: dict[str, int], column: str, row: int, rule: str, wrong: str, todo: str
) -> Note:
    place = found[column]
    typed = show(table.columns[place][row])[:200]
    cell = table.address(place, row)
    return Note(levels.WARN, rule, wrong, todo, column, None, cell, typed, sheet=table.name)
