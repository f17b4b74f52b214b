"""Tables as the team typed them: header texts, cells, and the address of every cell."""

from __future__ import annotations

import datetime
from dataclasses import dataclass, field
from functools import cache
from typing import Any

from drystone.sheet.notes import Note


@dataclass(frozen=True, slots=True)
class Broken:
    """A cell that shows no usable value.

    Parameters
    ----------
    literal : what the cell shows, such as ``#DIV/0!``
    unsaved : True for a formula whose value was never stored
    """

    literal: str
    unsaved: bool = False


ERROR_LITERALS = frozenset(
    {"#DIV/0!", "#N/A", "#NAME?", "#NULL!", "#NUM!", "#REF!", "#VALUE!", "#SPILL!", "#CALC!"}
)

Cell = Any  # str, float, int, bool, date, time, Broken; "" and None are blank


@dataclass(frozen=True)
class RawTable:
    """One table of the sheet.

    Parameters
    ----------
    name : sheet of the workbook, or file of the folder, as the team knows it
    headers : text of every named column
    positions : place of each of them, from 0, in the sheet
    columns : the cells of each of them, from top to bottom
    row_numbers : row of the sheet, from 1, where each entry of a column stands
    header_row : row of the sheet, from 1, that holds the headers
    """

    name: str
    headers: tuple[str, ...]
    positions: tuple[int, ...]
    columns: tuple[list[Cell], ...]
    row_numbers: tuple[int, ...]
    header_row: int = 1

    def address(self, column: int, row: int) -> str:
        """Address, such as F143, of entry ``row`` of named column ``column``."""
        return f"{letters(self.positions[column])}{self.row_numbers[row]}"

    def header_address(self, column: int) -> str:
        """Address of the header of named column ``column``."""
        return f"{letters(self.positions[column])}{self.header_row}"


@dataclass(frozen=True)
class RawSheet:
    """The extraction sheet as typed.

    Parameters
    ----------
    file : name of the workbook or folder
    comparisons : one row = one comparison
    studies : one row = one study; None when there is no such table
    remarks : what the reader noticed about the tables as a whole
    """

    file: str
    comparisons: RawTable
    studies: RawTable | None = None
    remarks: tuple[Note, ...] = field(default=())


@cache
def letters(position: int) -> str:
    """Column letters of a place counted from 0: 0 is A, 25 is Z, 26 is AA."""
    text = ""
    position += 1
    while position:
        position, rest = divmod(position - 1, 26)
        text = chr(65 + rest) + text
    return text


def show(cell: Cell) -> str:
    """Text of a cell as a person would read it back: 1999, not 1999.0."""
    if isinstance(cell, str):
        # lone halves of a character cannot be written to any file
        return cell if cell.isascii() else cell.encode("utf-8", "replace").decode()
    if cell is None:
        return ""
    if isinstance(cell, float):
        return str(int(cell)) if cell.is_integer() and abs(cell) < 1e15 else repr(cell)
    if isinstance(cell, Broken):
        return cell.literal
    if isinstance(cell, datetime.datetime) and cell.time() == datetime.time():
        return cell.date().isoformat()
    if isinstance(cell, datetime.date | datetime.time):
        return cell.isoformat()
    return str(cell).upper() if isinstance(cell, bool) else str(cell)
