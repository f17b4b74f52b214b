"""What the guard looks for in the parts of an .xlsx workbook."""

from __future__ import annotations

from array import array
from typing import Any

from drystone.sheet import limits
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken, letters
from drystone.sheet.scan_stream import Meter, Start

MOST_NAMES = 2_000  # sheets, or parts that a workbook points to
_DIGITS = "0123456789"
_FORMULA, _VALUE, _CELL, _ROW, _DATA, _OTHER = range(6)
_KINDS = {"f": _FORMULA, "v": _VALUE, "is": _VALUE, "c": _CELL, "row": _ROW, "sheetData": _DATA}


class SheetScan:
    """Used rectangle, error values and unsaved formulas of one sheet.

    Any part may be given: cells count from the element sheetData on, whatever the root is called.

    Parameters
    ----------
    lengths : lengths of the shared texts; when given, the text of every cell is counted
    """

    def __init__(self, name: str, meter: Meter, lengths: array[int] | None = None) -> None:
        self.name, self._meter, self._lengths = name, meter, lengths
        self.starts, self.matters = 0, False
        self.broken: dict[tuple[int, int], Broken] = {}
        self.shared_cells = 0
        self._rows = self._columns = 0
        self._row_text, self._cut, self._fresh = "0", -1, True
        self._reference, self._beyond = "", 0  # the last address, and cells after it without one
        self._known: set[str] = set()  # letters of columns that hold a value
        self._kinds: dict[str, int] = {}
        self._type: str | None = None
        self._formula = False
        self._text: list[str] | None = None  # what is caught of a cell that matters

    def attach(self, parser: Any) -> Start:
        """See `scan_stream.Listener`; the cell before is judged when the next one begins."""
        self._parser = parser
        return self._start

    def close(self) -> None:
        """Judge the last cell and the used rectangle."""
        self._judge()
        self._meter.count_area(self._rows, self._columns, self.name)

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        self.starts += 1
        kind = self._kinds.get(name)
        if kind is None:
            kind = self._kinds[name] = _KINDS.get(name.rpartition(":")[2], _OTHER)
        if kind == _VALUE:
            self._value()
        elif kind == _CELL:
            if self._formula or self._text is not None:
                self._judge()
            self._type = attributes.get("t")
            reference = attributes.get("r")
            if reference is None:
                self._beyond += 1
            else:
                self._reference, self._beyond = reference, 0
        elif kind == _FORMULA:
            self._formula = True
        elif kind == _ROW:
            self._judge()
            self._begin_row(attributes.get("r"))
        elif kind == _DATA:
            self.matters = True

    def _begin_row(self, number: str | None) -> None:
        self._row_text = number or str(int(self._row_text) + 1)
        self._cut = -len(self._row_text)
        self._fresh, self._reference, self._beyond = True, "", 0

    def _value(self) -> None:
        """Take note of a value; only the first of a row or column needs a closer look."""
        reference, cut = self._reference, self._cut
        if (
            self._fresh
            or self._beyond
            or reference[:cut] not in self._known
            or reference[cut:] != self._row_text
        ):
            self._widen()
        kind = self._type
        if kind == "s":
            self.shared_cells += 1
            if self._lengths is not None:
                self._catch()
        elif kind == "e" or self._formula:
            self._catch()

    def _widen(self) -> None:
        if not self.matters:
            return
        row, column = self._place()
        if not self._beyond:
            self._known.add(self._reference[: self._cut])
        self._fresh = False
        self._rows, self._columns = max(self._rows, row + 1), max(self._columns, column + 1)
        if row >= limits.MOST_ROWS or column >= limits.MOST_COLUMNS:
            far = f"{letters(column)}{row + 1}"[:20]
            raise SheetProblem(limits.too_wide(), self._meter.file, self.name, far)
        self._meter.check_area(self._rows, self._columns, self.name)

    def _place(self) -> tuple[int, int]:
        """Row and column, from 0, of the present cell; one without address follows the last."""
        if not self._reference:
            if int(self._row_text) < 1:
                raise ValueError("a cell outside any row")
            return int(self._row_text) - 1, self._beyond - 1
        name = self._reference.rstrip(_DIGITS)
        row, column = int(self._reference[len(name) :]), 0
        if row < 1 or not (name.isascii() and name.isalpha()):
            raise ValueError("no address")
        for letter in name[:8].upper():
            column = column * 26 + ord(letter) - 64
        return row - 1, column - 1 + self._beyond

    def _catch(self) -> None:
        self._text = []
        self._parser.CharacterDataHandler = self._text.append

    def _judge(self) -> None:
        """Decide about the cell that ended."""
        text = "".join(self._text or ()).strip()
        if self._type == "e":
            self._keep(Broken(text or "#ERROR"))
        elif self._type == "s" and self._text is not None and self._lengths is not None:
            if text.isascii() and text.isdigit() and int(text) < len(self._lengths):
                self._meter.count_text(self._lengths[int(text)], self.name)
        elif self._formula and not text and self._type != "str":
            self._keep(Broken("", unsaved=True))
        self._formula, self._type = False, None
        if self._text is not None:
            self._text = None
            self._parser.CharacterDataHandler = None

    def _keep(self, cell: Broken) -> None:
        if self.matters:
            self._widen()
            self.broken[self._place()] = cell


class TextScan:
    """Lengths of the shared texts of a workbook."""

    def __init__(self) -> None:
        self.starts, self.matters = 0, True
        self.lengths: array[int] = array("L")
        self._length = -1

    def attach(self, parser: Any) -> Start:
        """See `scan_stream.Listener`."""
        parser.CharacterDataHandler = self._data
        parser.buffer_text = True
        return self._start

    def close(self) -> None:
        """Keep the last text."""
        if self._length >= 0:
            self.lengths.append(self._length)

    def _start(self, name: str, _: dict[str, str]) -> None:
        self.starts += 1
        if name == "si" or name.endswith(":si"):
            self.close()
            self._length = 0

    def _data(self, text: str) -> None:
        if self._length >= 0:
            self._length += len(text)


class NameScan:
    """Elements of one name, and one of their attributes by relationship id."""

    def __init__(self, element: str, value: str) -> None:
        self.starts, self.matters = 0, True
        self.found: dict[str, str] = {}
        self.seen = 0
        self._element, self._value = element, value

    def attach(self, parser: Any) -> Start:
        """See `scan_stream.Listener`."""
        return self._start

    def close(self) -> None:
        """Nothing is left to do."""

    def _start(self, name: str, attributes: dict[str, str]) -> None:
        self.starts += 1
        if name.rpartition(":")[2] != self._element:
            return
        self.seen += 1
        if self.seen > MOST_NAMES:
            raise ValueError("too many")
        ids = [text for key, text in attributes.items() if key.rpartition(":")[2].lower() == "id"]
        for key in ids:
            self.found[key] = attributes.get(self._value, "")
