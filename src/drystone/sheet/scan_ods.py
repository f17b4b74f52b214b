"""What the guard looks for in the content of an .ods workbook."""

from __future__ import annotations

import re
from typing import Any

from drystone.sheet import limits
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import ERROR_LITERALS, Broken, letters
from drystone.sheet.scan_stream import Meter, Start

_ERROR = re.compile(r"Err:\d+")
_CELLS = frozenset({"table:table-cell", "table:covered-table-cell"})


class ContentScan:
    """Used rectangle, error values and unsaved formulas of all sheets of an .ods workbook."""

    def __init__(self, meter: Meter) -> None:
        self._meter = meter
        self.starts, self.matters = 0, True
        self.broken: dict[str, dict[tuple[int, int], Broken]] = {}
        self._sheet = ""
        self._rows = self._columns = 0
        self._row, self._row_repeat = 0, 0
        self._column, self._repeat = 0, 0
        self._attributes: dict[str, str] = {}
        self._in_cell = self._has_text = self._in_comment = False
        self._text: list[str] | None = None

    def attach(self, parser: Any) -> Start:
        """See `scan_stream.Listener`; the cell before is judged when the next one begins."""
        self._parser = parser
        return self._start

    def close(self) -> None:
        """Judge the last cell and the last sheet."""
        self._judge()
        self._meter.count_area(self._rows, self._columns, self._sheet)

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        self.starts += 1
        if name in _CELLS:
            self._judge()
            self._begin(attributes)
        elif name == "text:p":
            if self._in_cell and not self._in_comment:
                self._has_text = True
        elif name == "table:table-row":
            self._judge()
            self._row += self._row_repeat
            self._row_repeat = _count(attributes.get("table:number-rows-repeated", "1"))
            self._column, self._repeat = 0, 0
        elif name == "office:annotation":
            self._in_comment = True
        elif name == "table:table":
            self.close()
            self._sheet = attributes.get("table:name", "")
            self._rows = self._columns = 0
            self._row, self._row_repeat = 0, 0

    def _begin(self, attributes: dict[str, str]) -> None:
        self._column += self._repeat
        repeat = attributes.get("table:number-columns-repeated")
        self._repeat = 1 if repeat is None else _count(repeat)
        self._attributes = attributes
        self._in_cell, self._has_text, self._in_comment = True, False, False
        if (
            "table:formula" in attributes
            or self._repeat * self._row_repeat > 1
            or attributes.get("calcext:value-type") == "error"
        ):
            self._text = []
            self._parser.CharacterDataHandler = self._text.append

    def _judge(self) -> None:
        if not self._in_cell:
            return
        self._in_cell = False
        text = None
        if self._text is not None:
            text = "".join(self._text).strip()
            self._text = self._parser.CharacterDataHandler = None
        attributes = self._attributes
        broken = None if text is None else self._broken(text)
        typed = "office:value-type" in attributes or "calcext:value-type" in attributes
        if not (typed or self._has_text or broken):
            return
        row, column = self._row + self._row_repeat, self._column + self._repeat
        if row > self._rows or column > self._columns:
            self._widen(row, column)
        repeats = self._repeat * self._row_repeat
        if repeats > 1:
            size = len(text or "") + sum(map(len, attributes.values()))
            self._meter.count_text(size * repeats, self._sheet)
        if broken is not None:
            self._keep(broken)

    def _broken(self, text: str) -> Broken | None:
        kind = self._attributes.get("office:value-type")
        if self._attributes.get("calcext:value-type") == "error":
            return Broken(text or "#ERROR")
        if "table:formula" not in self._attributes:
            return None
        if text in ERROR_LITERALS or _ERROR.fullmatch(text):
            return Broken(text)
        return Broken("", unsaved=True) if kind is None and not text else None

    def _widen(self, row: int, column: int) -> None:
        """Take note of a value whose cells end before this row and column, both from 0."""
        if row > limits.MOST_ROWS or column > limits.MOST_COLUMNS:
            far_row = row if row > limits.MOST_ROWS else self._row + 1
            far_column = column if column > limits.MOST_COLUMNS else self._column + 1
            address = f"{letters(min(far_column, 10**6) - 1)}{far_row}"
            raise SheetProblem(limits.too_wide(), self._meter.file, self._sheet, address)
        self._rows, self._columns = max(self._rows, row), max(self._columns, column)
        self._meter.check_area(self._rows, self._columns, self._sheet)

    def _keep(self, broken: Broken) -> None:
        found = self.broken.setdefault(self._sheet, {})
        self._meter.count_elements(self._row_repeat * self._repeat)
        for row in range(self._row, self._row + self._row_repeat):
            for column in range(self._column, self._column + self._repeat):
                found[row, column] = broken


def _count(text: str) -> int:
    return max(int(text), 1) if text.isascii() and text.isdigit() and len(text) < 12 else 1
