"""From findings to the cells that are marked."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import pandas as pd
from openpyxl.utils.cell import column_index_from_string

from drystone.sheet.grid import header_text
from drystone.words import levels

_ADDRESS = re.compile(r"([A-Z]{1,3})([1-9]\d{0,6})")
Place = tuple[str, int, int]  # sheet or file as the findings name it; row and column from 1


@dataclass(frozen=True, slots=True)
class Mark:
    """One finding and where the copy shows it.

    Parameters
    ----------
    place : None when no cell of the copy belongs to it
    """

    level: str
    rule: str
    sheet: str
    cell: str
    row_id: str
    column: str
    value: str
    wrong: str
    todo: str
    place: Place | None = None


def place_marks(
    findings: pd.DataFrame,
    rows: pd.DataFrame,
    columns: Mapping[str, Sequence[str]],
    sheets: Mapping[str, Any],
) -> list[Mark]:
    """Every finding with its cell: stop first, then ask, warn, fixed.

    A finding about a whole row is shown at the row's name, one about a whole column at its header.

    Parameters
    ----------
    findings : as in `drystone.tables.check.FINDINGS`
    rows : the typed rows, with ``row_id``, ``sheet`` and ``sheet_row``
    columns : letter and header, as typed, of each of our columns that the sheet has
    sheets : sheet of the copy by the name that findings use
    """
    finder = _Finder(rows, columns, sheets)
    filled = findings.fillna("").astype(str)
    order = {level: rank for rank, level in enumerate(levels.LEVELS)}
    marks = [
        replace(Mark(*record), place=finder.place(*record[2:6]))
        for record in filled[list(Mark.__slots__[:-1])].itertuples(index=False, name=None)
    ]
    return sorted(marks, key=lambda mark: order.get(mark.level, len(order)))


class _Finder:
    """Looks up cells of rows and columns; headers are searched once for each column."""

    def __init__(
        self,
        rows: pd.DataFrame,
        columns: Mapping[str, Sequence[str]],
        sheets: Mapping[str, Any],
    ) -> None:
        self._sheets, self._columns = sheets, columns
        self._name = next((n for n in ("row_id", "study") if n in columns), None)
        self._rows = {
            str(row_id): (str(sheet), int(number))
            for row_id, sheet, number in zip(
                rows["row_id"], rows["sheet"], rows["sheet_row"], strict=True
            )
        }
        self._table = str(rows["sheet"].iloc[0]) if len(rows) else ""
        self._top = int(rows["sheet_row"].min()) if len(rows) else 0
        self._headers: dict[str, Place | None] = {}

    def place(self, sheet: str, cell: str, row_id: str, column: str) -> Place | None:
        """Cell of a finding; None when there is none."""
        found = _ADDRESS.fullmatch(cell)
        if found:
            letters, number = found.groups()
            return self._known(sheet, int(number), column_index_from_string(letters))
        if row_id in self._rows:
            table, number = self._rows[row_id]
            return self._known(table, number, self._column_number(column or self._name))
        if column in self._columns and sheet in ("", self._table):
            if column not in self._headers:
                self._headers[column] = self._header(column)
            return self._headers[column]
        return None

    def _known(self, sheet: str, row: int, column: int) -> Place | None:
        inside = row <= 1_048_576 and column <= 16_384
        return (sheet, row, column) if sheet in self._sheets and inside else None

    def _column_number(self, column: str | None) -> int:
        letters = self._columns.get(column or "", self._columns.get(self._name or "", ("A",)))[0]
        return column_index_from_string(letters)

    def _header(self, column: str) -> Place | None:
        """Cell above the rows that holds the header as typed; the nearest one counts."""
        letters, header = self._columns[column][:2]
        sheet, number = self._sheets.get(self._table), column_index_from_string(letters)
        if sheet is None:
            return None
        for row in range(self._top - 1, 0, -1):
            cell = sheet._cells.get((row, number))  # asking for a cell would make it
            if cell is not None and header_text(str(cell.value or "")) == header:
                return self._known(self._table, row, number)
        return None
