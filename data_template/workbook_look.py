"""How drystone's workbooks look: headers with comments, pick-lists, folded column groups.

Everything is taken from the pandera schemas, so a new column or a new allowed value reaches the
workbooks by itself. The files are written without clock times: the same content gives the same
bytes.
"""

from __future__ import annotations

import datetime
import io
import zipfile
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any

import pandera.pandas as pa
from openpyxl import Workbook
from openpyxl.comments import Comment
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side
from openpyxl.utils import get_column_letter
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.worksheet import Worksheet
from openpyxl.writer.excel import ExcelWriter

Columns = Mapping[str, pa.Column]

LAST_ROW = 10_000  # pick-lists reach down to here
LONGEST_LIST = 255  # characters that the file format allows for a pick-list typed into a cell rule
FIXED_TIME = datetime.datetime(2020, 1, 1)
COMMENT_AUTHOR = "drystone"

REQUIRED = PatternFill("solid", start_color="FF3F5A4B", end_color="FF3F5A4B")
OPTIONAL = PatternFill("solid", start_color="FFE3E6DC", end_color="FFE3E6DC")
ON_DARK = Font(name="Calibri", size=11, bold=True, color="FFFFFFFF")
ON_LIGHT = Font(name="Calibri", size=11, bold=True, color="FF20302A")
BESIDE_GROUP = Border(left=Side(style="medium", color="FF8A9A8F"))
WRAPPED = Alignment(wrap_text=True, vertical="top")


def unit_of(column: pa.Column) -> str:
    """Unit of a column; blank for text."""
    return str(column.metadata.get("unit", ""))


def allowed_in(column: pa.Column) -> tuple[str, ...]:
    """Values that a cell of the column may hold; empty when any value may stand there."""
    return tuple(column.metadata.get("allowed", ()))


def comment_text(column: pa.Column) -> str:
    """What the header's comment says: description, unit, allowed values, whether required."""
    parts = [str(column.description)]
    if unit_of(column):
        parts.append(f"Unit: {unit_of(column)}")
    if allowed_in(column):
        parts.append("One of: " + "; ".join(allowed_in(column)))
    if not column.nullable:
        parts.append("Required")
    return "\n".join(parts)


def new_workbook(title: str, description: str) -> Workbook:
    """Workbook without sheets, with fixed properties."""
    workbook = Workbook()
    workbook.remove(workbook.active)
    properties = workbook.properties
    properties.creator = COMMENT_AUTHOR
    properties.title = title
    properties.description = description
    properties.created = FIXED_TIME
    return workbook


def add_table(
    workbook: Workbook,
    name: str,
    columns: Columns,
    rows: Sequence[Mapping[str, Any]] = (),
    folded: Iterable[str] = (),
) -> Worksheet:
    """Sheet ``name`` with one header row, the given rows, and the columns ``folded`` away.

    Parameters
    ----------
    workbook : receives the sheet
    name : of the sheet
    columns : by name, in order
    rows : cells by column name; an absent name is a blank cell
    folded : names of columns that stand in collapsed groups
    """
    sheet = workbook.create_sheet(name)
    sheet.append(list(columns))
    for row in rows:
        sheet.append([row.get(column) for column in columns])
    for index, (column_name, column) in enumerate(columns.items(), start=1):
        _dress_header(sheet, index, column_name, column)
        _add_pick_list(sheet, index, column)
    _fold(sheet, columns, set(folded))
    sheet.row_dimensions[1].height = 30
    sheet.freeze_panes = "C2" if len(columns) > 10 else "B2"
    return sheet


def add_page(workbook: Workbook, name: str, lines: Sequence[str], width: int = 100) -> Worksheet:
    """Sheet of running text, one line a row, the first one as its heading."""
    sheet = workbook.create_sheet(name)
    for line in lines:
        sheet.append([line])
        sheet.cell(sheet.max_row, 1).alignment = WRAPPED
        sheet.row_dimensions[sheet.max_row].height = 16 * _lines(line, width - 10) + 4
    sheet.cell(1, 1).font = Font(name="Calibri", bold=True, size=14)
    sheet.column_dimensions["A"].width = width
    return sheet


def save_fixed(workbook: Workbook, path: Path) -> None:
    """Write the workbook so that the same content gives the same bytes."""
    workbook.properties.modified = FIXED_TIME
    loose = io.BytesIO()
    ExcelWriter(workbook, zipfile.ZipFile(loose, "w")).save()
    with zipfile.ZipFile(loose) as source, zipfile.ZipFile(path, "w") as target:
        for entry in sorted(source.namelist()):
            info = zipfile.ZipInfo(entry, FIXED_TIME.timetuple()[:6])
            info.compress_type = zipfile.ZIP_DEFLATED
            info.external_attr = 0o644 << 16
            info.create_system = 3  # the same on every platform
            target.writestr(info, source.read(entry))


def _dress_header(sheet: Worksheet, index: int, name: str, column: pa.Column) -> None:
    cell = sheet.cell(1, index)
    cell.fill = OPTIONAL if column.nullable else REQUIRED
    cell.font = ON_LIGHT if column.nullable else ON_DARK
    cell.alignment = WRAPPED
    text = comment_text(column)
    cell.comment = Comment(text, COMMENT_AUTHOR, width=280, height=26 + 20 * _lines(text))
    typed = sheet.iter_rows(min_row=2, min_col=index, max_col=index, values_only=True)
    longest = max([0, *(len(str(value)) for (value,) in typed if value is not None)])
    width = max(10, _header_width(name), min(longest + 1, 64))
    sheet.column_dimensions[get_column_letter(index)].width = width


def _header_width(name: str) -> int:
    return min(int(1.2 * len(name)) + 3, 30)


def _lines(text: str, per_line: int = 38) -> int:
    return sum(1 + len(line) // per_line for line in text.split("\n"))


def _add_pick_list(sheet: Worksheet, index: int, column: pa.Column) -> None:
    values = allowed_in(column)
    if not values:
        return
    listed = ",".join(values)
    if len(listed) > LONGEST_LIST or any("," in value or '"' in value for value in values):
        raise ValueError(f"the values {values} do not fit into a pick-list")
    rule = DataValidation(type="list", formula1=f'"{listed}"', allow_blank=True)
    rule.errorTitle = "Not in the list"
    rule.error = "Please choose from the list, or leave the cell blank and write a note."
    letter = get_column_letter(index)
    rule.add(f"{letter}2:{letter}{LAST_ROW}")
    sheet.add_data_validation(rule)


def _fold(sheet: Worksheet, columns: Columns, folded: set[str]) -> None:
    """Collapse the folded columns, one button for all and one for each group.

    Neighbouring groups of one outline level would melt into one. So the first column of each
    group stands one level higher than the rest of it and carries the group's button.
    """
    sheet.sheet_properties.outlinePr.summaryRight = False
    previous = ""
    for index, (name, column) in enumerate(columns.items(), start=1):
        group = str(column.metadata["group"])
        if name in folded:
            first = group != previous
            dimension = sheet.column_dimensions[get_column_letter(index)]
            dimension.hidden = True
            dimension.outlineLevel = 1 if first else 2
            dimension.collapsed = first
            if first:
                sheet.cell(1, index).border = BESIDE_GROUP
        previous = group if name in folded else ""
    _mark_button(sheet, columns, folded)


def _mark_button(sheet: Worksheet, columns: Columns, folded: set[str]) -> None:
    for before, name in zip(columns, list(columns)[1:], strict=False):
        if name in folded and before not in folded:
            index = list(columns).index(before) + 1
            sheet.column_dimensions[get_column_letter(index)].collapsed = True
