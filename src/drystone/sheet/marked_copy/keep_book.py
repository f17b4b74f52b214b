"""Opens the team's workbook so that as much of it as possible can be written again."""

from __future__ import annotations

import io
import re
import warnings
import zipfile
from dataclasses import dataclass, field
from typing import Any
from xml.etree import ElementTree

from openpyxl import Workbook
from openpyxl.comments import Comment
from openpyxl.reader.excel import ExcelReader
from openpyxl.worksheet.worksheet import Worksheet

from drystone.sheet.marked_copy.formulas import FormulaSheet, scan_formulas
from drystone.sheet.marked_copy.losses import Loss, find_losses

_STRICT = b"http://purl.oclc.org/ooxml"
_DROPPED = ("/drawing", "/pivotTable")  # parts that could be kept only in pieces
OUTSIDE = re.compile(r"\[\d+\]")  # a reference to another workbook
_THREAD = re.compile(r"\[Threaded comment\].*?Comment:\s*", re.DOTALL)


class NotKept(ValueError):
    """The workbook cannot be opened for keeping; only its values can be copied."""


@dataclass
class Book:
    """A workbook on its way to the marked copy.

    Parameters
    ----------
    book : what will be written
    titles : sheet of ``book`` for each sheet or file that a finding names
    losses : what the copy lacks
    changes : what the copy has in another form, in sentences
    formulas : formulas of the original by sheet of ``book``
    """

    book: Workbook
    titles: dict[str, str]
    losses: list[Loss] = field(default_factory=list)
    changes: list[str] = field(default_factory=list)
    formulas: dict[str, FormulaSheet] = field(default_factory=dict)


def open_book(content: bytes) -> Book:
    """Open the .xlsx workbook ``content``, which the guard has seen, with its stored values.

    Raises
    ------
    NotKept
        When it is written in a way that cannot be kept.
    """
    _quiet()
    try:
        return _opened(content)
    except NotKept:
        raise
    except Exception as error:  # whatever an odd style, table or rule makes of the library
        raise NotKept(str(error).strip() or type(error).__name__) from error


def _opened(content: bytes) -> Book:
    reader = ExcelReader(io.BytesIO(content), data_only=True, keep_links=False, rich_text=True)
    reader.archive = _PlainParts(io.BytesIO(content))
    if _STRICT in reader.archive.read("xl/workbook.xml")[:4_000]:
        raise NotKept("it is written in the strict form of the format")
    reader.read()
    book = reader.wb
    parts = {
        relation.target: sheet.name
        for sheet, relation in reader.parser.find_sheets()
        if isinstance(_sheet(book, sheet.name), Worksheet)
    }
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        made = Book(
            book,
            {name: name for name in parts.values()},
            find_losses(archive, parts),
            formulas=scan_formulas(archive, parts),
        )
    _settle(made)
    return made


class _PlainParts(zipfile.ZipFile):
    """The workbook's zip file; sheets do not point to drawings and pivot tables."""

    def read(self, name: Any, pwd: bytes | None = None) -> bytes:
        content = super().read(name, pwd)
        if isinstance(name, str) and "sheets/_rels/" in name:
            return _without_dropped(content)
        return content


def _without_dropped(content: bytes) -> bytes:
    root = ElementTree.fromstring(content)
    for relation in list(root):
        if relation.get("Type", "").endswith(_DROPPED):
            root.remove(relation)
    return ElementTree.tostring(root)


def _quiet() -> None:
    """Turn off the library's remarks: what it drops is listed on the copy's first sheet.

    The filter is set for good and the same each time, so that no thread sees it come and go.
    """
    warnings.filterwarnings("ignore", module=r"openpyxl\.")


def _sheet(book: Workbook, name: str) -> Any:
    return book[name] if name in book.sheetnames else None


def _settle(made: Book) -> None:
    """Take out what would point outside or to nothing; mend what reading has bent."""
    book = made.book
    for sheet in list(book.chartsheets):
        book.remove(sheet)
    book.template = False
    comments, gone = 0, _drop_outside_names(book.defined_names)
    for sheet in book.worksheets:
        gone += _drop_outside_names(sheet.defined_names)
        sheet.sheet_view.tabSelected = False
        for cell in list(sheet._cells.values()):
            if getattr(cell, "_comment", None) is not None:
                _plain_comment(cell)
                comments += 1
    if comments:
        made.changes.append("your own comments keep their words, not their type and size")
    if gone:
        made.losses.append(
            Loss("names that point to another workbook", gone, "the values in the cells are kept")
        )


def _drop_outside_names(names: Any) -> int:
    outside = [name for name, entry in names.items() if OUTSIDE.search(entry.value or "")]
    for name in outside:
        del names[name]
    return len(outside)


def _plain_comment(cell: Any) -> None:
    comment = cell.comment
    text = _THREAD.sub("", comment.text or "")
    author = comment.author or ""
    if text != comment.text or author.startswith("tc="):
        author = "comment" if author.startswith("tc=") else author
        cell.comment = Comment(text, author)
