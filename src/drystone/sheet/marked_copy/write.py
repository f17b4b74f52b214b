"""Writes the marked copy of a sheet: opens what can be kept, marks it, saves it."""

from __future__ import annotations

import gc
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from pathlib import Path

import pandas as pd
from openpyxl import Workbook

from drystone.sheet import limits
from drystone.sheet.guard import inspect
from drystone.sheet.marked_copy.fresh_book import book_of_tables, book_of_values
from drystone.sheet.marked_copy.front import Front
from drystone.sheet.marked_copy.keep_book import Book, NotKept, open_book
from drystone.sheet.marked_copy.listing import list_findings
from drystone.sheet.marked_copy.marks import forget_notes, mark_cells, quote_formulas
from drystone.sheet.marked_copy.places import place_marks
from drystone.sheet.readers import WORKBOOKS, read_sheet

FRONT, LISTING = "marked copy", "findings"
Columns = Mapping[str, Sequence[str]]


def write_marked_copy(
    sheet: Path, findings: pd.DataFrame, rows: pd.DataFrame, columns: Columns, target: Path
) -> None:
    """Write the marked copy of ``sheet`` to ``target``, which no program has open.

    Parameters
    ----------
    sheet : workbook, CSV file or folder of CSV files; only read
    findings : as in `drystone.tables.check.FINDINGS`
    rows : the typed rows of the sheet, with ``row_id``, ``sheet`` and ``sheet_row``
    columns : letter and header, as typed, of each of our columns that the sheet has

    Raises
    ------
    SheetProblem
        When the sheet cannot be read (any more).
    OSError
        When ``target`` cannot be written.
    """
    with _no_collection():
        kept = _open(sheet)
        try:
            _mark(kept, sheet, findings, rows, columns).save(target)
        except (OSError, MemoryError):
            raise
        except Exception as error:  # what was read cannot be written again
            if sheet.suffix.lower() not in WORKBOOKS:
                raise
            why = f"the workbook holds something that cannot be written again ({error})"
            plain = _values(limits.read_whole(sheet), str(sheet), why)
            _mark(plain, sheet, findings, rows, columns).save(target)


def _open(sheet: Path) -> Book:
    kind = sheet.suffix.lower()
    if sheet.is_dir() or kind not in WORKBOOKS:
        return book_of_tables(read_sheet(sheet))
    content = limits.read_whole(sheet)
    if kind == ".ods":
        return _values(content, str(sheet), "they are not copied from .ods")
    inspect(content, str(sheet))
    try:
        return open_book(content)
    except NotKept as problem:
        return _values(content, str(sheet), f"the workbook could not be opened whole ({problem})")


def _values(content: bytes, file: str, why: str) -> Book:
    return book_of_values(content, inspect(content, file).broken, why)


def _mark(
    made: Book, sheet: Path, findings: pd.DataFrame, rows: pd.DataFrame, columns: Columns
) -> Workbook:
    book = made.book
    sheets = {name: book[title] for name, title in made.titles.items()}
    forget_notes(made)
    marks = place_marks(findings, rows, columns, sheets)
    front = book.create_sheet(_free(book, FRONT), 0)
    listing = book.create_sheet(_free(book, LISTING), 1)
    marked = mark_cells(made, marks)
    quote_formulas(made)
    if any(item.conditional_formatting for item in sheets.values()):
        made.changes.append("where a conditional format of yours colours a cell, it hides the mark")
    Front(made, front).write(sheet.name, marks, marked, list_findings(made, listing, marks))
    book.active = 0
    front.sheet_view.tabSelected = True  # no other is: an edit would go into all selected sheets
    return book


def _free(book: Workbook, name: str) -> str:
    """``name``, with a number when the workbook has such a sheet; capitals do not count."""
    taken = {title.casefold() for title in book.sheetnames}
    names = [name, *(f"{name} {number}" for number in range(2, len(taken) + 3))]
    return next(candidate for candidate in names if candidate.casefold() not in taken)


@contextmanager
def _no_collection() -> Iterator[None]:
    """Hold back the search for garbage, which takes half the time among millions of cells.

    Harmless to other threads: what they leave is collected afterwards.
    """
    was_on = gc.isenabled()
    gc.disable()
    try:
        yield
    finally:
        if was_on:
            gc.enable()
