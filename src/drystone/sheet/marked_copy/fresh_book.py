"""A new workbook with the values of a sheet at their addresses, where formats cannot be kept."""

from __future__ import annotations

import datetime
import io
import re
from collections.abc import Iterator, Mapping
from typing import Any

from openpyxl import Workbook
from openpyxl.styles import Font
from openpyxl.utils.cell import get_column_letter
from python_calamine import CalamineWorkbook, SheetTypeEnum

from drystone.sheet.marked_copy.keep_book import Book
from drystone.sheet.marked_copy.look import as_number, put_text
from drystone.sheet.marked_copy.losses import Loss
from drystone.sheet.raw import Broken, RawSheet, RawTable, show

_FORBIDDEN = re.compile(r"[\\/*?:\[\]]")
LONGEST_TITLE = 31
NARROWEST, WIDEST = 9, 40  # characters of a column
LOOKED_AT = 200  # rows that decide a column's width
Brokens = Mapping[str, Mapping[tuple[int, int], Broken]]


def book_of_values(content: bytes, broken: Brokens, why: str) -> Book:
    """Workbook with the values of every sheet of the .xlsx or .ods workbook ``content``.

    Parameters
    ----------
    broken : cells without a usable value by sheet, then by (row, column) from 0
    why : why nothing but values is copied, as a clause
    """
    source = CalamineWorkbook.from_filelike(io.BytesIO(content))
    made = _empty()
    for entry in source.sheets_metadata:
        if entry.typ != SheetTypeEnum.WorkSheet:
            continue
        sheet = _add(made, entry.name)
        grid = source.get_sheet_by_name(entry.name).to_python(skip_empty_area=False)
        for i, row in enumerate(grid, start=1):
            for j, value in enumerate(row, start=1):
                if value != "":
                    _put(sheet.cell(i, j), value)
        for (i, j), cell in broken.get(entry.name, {}).items():
            _put(sheet.cell(i + 1, j + 1), cell)
    made.losses.append(
        Loss("formats, formulas, comments and all else but the values", 1, f"{why}; {_AT}")
    )
    return _finished(made)


def book_of_tables(raw: RawSheet) -> Book:
    """Workbook with the cells of CSV files, each at its row and column."""
    made = _empty()
    for table in (raw.comparisons, raw.studies):
        if table is None:
            continue
        sheet = _add(made, table.name)
        for i, j, value in _cells(table):
            _put(sheet.cell(i, j), _number(value))
        sheet.freeze_panes = f"A{table.header_row + 1}"
        for cell in sheet[table.header_row]:
            cell.font = Font(bold=True)
    made.changes.append(f"a CSV file has no formats, so this workbook is plain; {_AT}")
    return _finished(made)


_AT = "every value stands at the address that the findings name"


def _empty() -> Book:
    book = Workbook()
    book.remove(book.active)
    return Book(book, {})


def _add(made: Book, name: str) -> Any:
    """Add a sheet under ``name``, or what of it can be the name of a sheet."""
    plain = _FORBIDDEN.sub("_", name).strip("'") or "sheet"
    taken = {title.casefold() for title in made.book.sheetnames}
    ends = ["", *(f" {number}" for number in range(2, len(taken) + 3))]
    titles = (plain[: LONGEST_TITLE - len(end)] + end for end in ends)
    sheet = made.book.create_sheet(next(t for t in titles if t.casefold() not in taken))
    made.titles[name] = sheet.title
    sheet.sheet_view.tabSelected = False
    return sheet


def _cells(table: RawTable) -> Iterator[tuple[int, int, Any]]:
    for place, header, cells in zip(table.positions, table.headers, table.columns, strict=True):
        yield table.header_row, place + 1, header
        for row, value in zip(table.row_numbers, cells, strict=True):
            if value is not None and value != "":
                yield row, place + 1, value


def _number(value: Any) -> Any:
    """Number of a text that a spreadsheet would show in the same way, else the value itself."""
    number = as_number(value) if isinstance(value, str) else None
    return value if number is None else number


def _put(cell: Any, value: Any) -> None:
    if isinstance(value, float) and value.is_integer():
        cell.value = int(value)
    elif isinstance(value, bool | int | float | datetime.date | datetime.time | datetime.timedelta):
        cell.value = value
    else:
        put_text(cell, show(value))


def _finished(made: Book) -> Book:
    if not made.book.sheetnames:
        made.book.create_sheet("sheet")
    for sheet in made.book.worksheets:
        widths: dict[int, int] = {}
        for row in sheet.iter_rows(max_row=min(sheet.max_row, LOOKED_AT)):
            for cell in row:
                wide = len(str(cell.value)) if cell.value is not None else 0
                widths[cell.column] = max(widths.get(cell.column, NARROWEST), wide + 2)
        for column, wide in widths.items():
            sheet.column_dimensions[get_column_letter(column)].width = min(wide, WIDEST)
    return made
