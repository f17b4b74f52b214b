"""The copy's first sheet: what it could not keep, what the colours mean, how much was found."""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator, Sequence
from typing import Any

from drystone.sheet.marked_copy.keep_book import Book
from drystone.sheet.marked_copy.listing import Listing, link
from drystone.sheet.marked_copy.look import (
    BODY,
    FILLS,
    HEADING,
    LINKED,
    MEANINGS,
    RULE,
    STRONG,
    TITLE,
    WRAPPED,
    fit_height,
    put_text,
)
from drystone.sheet.marked_copy.marks import Marked
from drystone.sheet.marked_copy.places import Mark
from drystone.words import levels

WIDTHS = (("A", 34), ("B", 11), ("C", 13), ("D", 74))
MOST_KINDS = 100  # lines of the table of kinds
ADVICE = (
    "Mend your own workbook, not this copy: drystone never writes into yours, and the next check "
    "makes a new copy."
)
Line = tuple[str | int, ...]


class Front:
    """Writes the first sheet from top to bottom."""

    def __init__(self, made: Book, sheet: Any) -> None:
        self._made, self._sheet, self._row = made, sheet, 1
        for letter, wide in WIDTHS:
            sheet.column_dimensions[letter].width = wide
        sheet.sheet_view.showGridLines = False
        sheet.page_setup.orientation = "landscape"
        sheet.page_setup.fitToWidth, sheet.page_setup.fitToHeight = 1, 0
        sheet.sheet_properties.pageSetUpPr.fitToPage = True

    def write(self, file: str, marks: Sequence[Mark], marked: Marked, listing: Listing) -> None:
        """Write everything; ``listing`` is the list of findings."""
        self._text(f"{file}: marked copy", TITLE, 26)
        self._text(ADVICE, BODY)
        self._losses()
        self._legend(marks, marked, listing)
        self._kinds(marks)

    def _losses(self) -> None:
        self._heading("What this copy could not keep")
        for loss in self._made.losses:
            self._line((loss.what, loss.count if loss.count > 1 else "", "", loss.note))
        if not self._made.losses:
            self._text("Nothing was found that it could not keep.", BODY)
        if self._made.changes:
            self._heading("What it holds in another form")
            for change in self._made.changes:
                self._text(f"{change[:1].upper()}{change[1:]}.", BODY)

    def _legend(self, marks: Sequence[Mark], marked: Marked, listing: Listing) -> None:
        self._heading("What the colours mean")
        counts = Counter(mark.level for mark in marks)
        cells = Counter(mark.level for mark in marks if mark.place is not None)
        self._line(("level", "findings", "with a cell", "meaning"), STRONG)
        for level in levels.LEVELS:
            row = self._row
            self._line((level, counts[level], cells[level], MEANINGS[level]))
            self._sheet.cell(row, 1).fill = FILLS[level]
        for remark in _remarks(len(marks), marked, listing):
            self._text(remark, BODY)

    def _kinds(self, marks: Sequence[Mark]) -> None:
        if not marks:
            return
        self._heading("Findings by kind")
        self._line(("kind", "findings", "first cell", "what is wrong, there"), STRONG)
        kinds: dict[tuple[str, str, str], list[Mark]] = {}
        for mark in marks:
            kinds.setdefault((mark.level, mark.rule, mark.column), []).append(mark)
        for (level, rule, column), found in list(kinds.items())[:MOST_KINDS]:
            row, first = self._row, found[0]
            topic = f"{rule} ({column})" if column else rule
            self._line((topic, len(found), first.cell, first.wrong))
            self._sheet.cell(row, 1).fill = FILLS.get(level, FILLS[levels.WARN])
            if first.cell and link(self._made, self._sheet.cell(row, 3), first):
                self._sheet.cell(row, 3).font = LINKED
        if len(kinds) > MOST_KINDS:
            self._text(f"and {len(kinds) - MOST_KINDS} more kinds; see the list.", BODY)

    def _heading(self, text: str) -> None:
        self._row += 1
        self._text(text, HEADING)

    def _text(self, text: str, font: Any, height: float | None = None) -> None:
        """One text across the whole width; merged cells do not grow by themselves."""
        row = self._row
        cell = self._sheet.cell(row, 1)
        put_text(cell, text)
        cell.font, cell.alignment = font, WRAPPED
        self._sheet.merge_cells(start_row=row, end_row=row, start_column=1, end_column=len(WIDTHS))
        fit_height(self._sheet, row, [(text, sum(width for _, width in WIDTHS))])
        if height:
            self._sheet.row_dimensions[row].height = height
        self._row += 1

    def _line(self, texts: Line, font: Any = BODY) -> None:
        for column, text in enumerate(texts, start=1):
            cell = self._sheet.cell(self._row, column)
            if isinstance(text, int):
                cell.value = text
            else:
                put_text(cell, text)
            cell.font, cell.alignment, cell.border = font, WRAPPED, RULE
        widths = (width for _, width in WIDTHS)
        fit_height(self._sheet, self._row, zip(map(str, texts), widths, strict=True))
        self._row += 1


def _remarks(total: int, marked: Marked, listing: Listing) -> Iterator[str]:
    yield (
        f"{marked.cells:,} cells are coloured, each by its gravest finding; its comment says what "
        f"is wrong and what to do. The sheet '{listing.title}' lists the findings with links to "
        "the cells. A finding about a whole row is shown at the row's name, one about a whole "
        "column at its header."
    )
    if marked.hidden:
        yield f"{marked.hidden:,} of these cells stand in hidden rows, columns or sheets."
    if marked.unnoted:
        yield (
            f"Only the first {marked.cells - marked.unnoted:,} cells have a comment, since more "
            "make a workbook slow; the others are coloured."
        )
    if listing.left:
        yield (
            f"The list holds the first {total - listing.left:,} of {total:,} findings; "
            "findings.csv has them all."
        )
