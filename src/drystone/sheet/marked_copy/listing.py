"""The copy's list of findings: one line for each, with a link to its cell."""

from __future__ import annotations

from collections.abc import Sequence
from copy import copy
from dataclasses import dataclass
from typing import Any

from openpyxl.utils.cell import get_column_letter
from openpyxl.worksheet.hyperlink import Hyperlink

from drystone.sheet.marked_copy.keep_book import Book
from drystone.sheet.marked_copy.look import (
    BODY,
    FILLS,
    LINKED,
    RULE,
    STRONG,
    WRAPPED,
    as_number,
    fit_height,
    put_text,
)
from drystone.sheet.marked_copy.places import Mark

COLUMNS = (
    ("level", 8),
    ("sheet", 16),
    ("cell", 9),
    ("row", 12),
    ("column", 18),
    ("value", 22),
    ("rule", 24),
    ("what is wrong", 64),
    ("what to do", 48),
)
_WIDTHS = tuple(wide for _, wide in COLUMNS)
MOST_LISTED = 20_000  # lines; findings.csv has all. A sheet holds at most 65 530 links


@dataclass(frozen=True)
class Listing:
    """Name of the sheet that lists the findings, and how many were left to findings.csv."""

    title: str
    left: int


def list_findings(made: Book, sheet: Any, marks: Sequence[Mark]) -> Listing:
    """Write the findings into ``sheet``, one line for each."""
    for number, (name, wide) in enumerate(COLUMNS, start=1):
        cell = sheet.cell(1, number, name)
        cell.font, cell.border, cell.alignment = STRONG, RULE, WRAPPED
        sheet.column_dimensions[get_column_letter(number)].width = wide
    shown = marks[:MOST_LISTED]
    styles = _styles(sheet)
    for row, mark in enumerate(shown, start=2):
        _line(made, sheet, row, mark, styles)
    sheet.freeze_panes = "A2"
    sheet.auto_filter.ref = f"A1:{get_column_letter(len(COLUMNS))}{len(shown) + 1}"
    sheet.page_setup.orientation = "landscape"
    sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
    sheet.sheet_properties.pageSetUpPr.fitToPage = True
    sheet.print_title_rows = "1:1"
    return Listing(sheet.title, len(marks) - len(shown))


def link(made: Book, cell: Any, mark: Mark) -> bool:
    """Let ``cell`` lead to the cell of ``mark``; False when there is none."""
    if mark.place is None:
        return False
    sheet, row, column = mark.place
    title = made.titles[sheet].replace("'", "''")
    target = f"'{title}'!{get_column_letter(column)}{row}"
    cell.hyperlink = Hyperlink(ref=cell.coordinate, location=target)
    return True


def _line(made: Book, sheet: Any, row: int, mark: Mark, styles: dict[str, Any]) -> None:
    texts = (
        *(mark.level, made.titles.get(mark.sheet, mark.sheet), mark.cell, mark.row_id),
        *(mark.column, mark.value, mark.rule, mark.wrong, mark.todo),
    )
    for column, text in enumerate(texts, start=1):
        cell = sheet.cell(row, column)
        cell._style = copy(styles["body"])  # a shared style; setting each part anew takes seconds
        number = as_number(text)
        if number is not None:
            cell.value = number
        elif text:
            put_text(cell, text)
    fit_height(sheet, row, zip(texts, _WIDTHS, strict=True))
    sheet.cell(row, 1)._style = copy(styles.get(mark.level, styles["body"]))
    cell = sheet.cell(row, 3)
    if link(made, cell, mark):
        if not mark.cell and mark.place is not None:
            put_text(cell, f"{get_column_letter(mark.place[2])}{mark.place[1]}")
        cell._style = copy(styles["link"])


def _styles(sheet: Any) -> dict[str, Any]:
    """Styles of the lines by name, made once in a cell that is cleared again."""
    made: dict[str, Any] = {}
    cell = sheet.cell(2, 1)
    cell.alignment, cell.border = WRAPPED, RULE
    for name, font in (("body", BODY), ("link", LINKED)):
        cell.font = font
        made[name] = copy(cell._style)
    for level, fill in FILLS.items():
        cell.font, cell.fill = BODY, fill
        made[level] = copy(cell._style)
    return made
