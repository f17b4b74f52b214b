"""Colours cells and writes what is wrong beside them, after what the team wrote itself."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from typing import Any

from openpyxl.cell.cell import MergedCell
from openpyxl.comments import Comment

from drystone.sheet.marked_copy.formulas import Formula
from drystone.sheet.marked_copy.keep_book import OUTSIDE, Book
from drystone.sheet.marked_copy.look import clean, colour
from drystone.sheet.marked_copy.places import Mark

SIGN = "-- drystone --"  # begins what drystone adds to a comment
LONGEST_NOTE = 1_900  # characters that drystone adds to one comment
LONGEST_COMMENT = 32_000
MOST_NOTES = 10_000  # comments with findings; more make spreadsheet programs slow
MOST_QUOTED = 2_000  # comments that only quote a formula
WIDTH, LINE, TALLEST = 340, 19, 420  # pixels of a comment's box
LETTERS = 48  # that fit in a line of it


@dataclass(frozen=True)
class Marked:
    """How many cells were coloured, how many of them stand in hidden rows, columns or sheets."""

    cells: int
    hidden: int
    unnoted: int


def mark_cells(made: Book, marks: Sequence[Mark]) -> Marked:
    """Colour every cell of ``marks`` by its gravest finding, and write all of them beside it."""
    by_cell: dict[tuple[str, int, int], list[Mark]] = {}
    for mark in marks:
        if mark.place is not None:
            sheet, row, column = mark.place
            place = _anchor(made.book[made.titles[sheet]], row, column)
            by_cell.setdefault((made.titles[sheet], *place), []).append(mark)
    hidden = 0
    for number, ((title, row, column), found) in enumerate(by_cell.items()):
        cell = made.book[title].cell(row, column)
        colour(cell, found[0].level)
        hidden += _is_hidden(cell)
        if number < MOST_NOTES:
            add_note(cell, [_said(mark) for mark in found])
    return Marked(len(by_cell), hidden, max(0, len(by_cell) - MOST_NOTES))


def quote_formulas(made: Book) -> None:
    """Say beside each cell what formula stood there; put back formulas that have no value."""
    quoted = total = 0
    for title, formulas in made.formulas.items():
        sheet = made.book[title]
        for place, formula in formulas.cells.items():
            cell = sheet.cell(*place)
            if isinstance(cell, MergedCell):
                continue
            total += 1
            noted = cell.comment is not None
            if formula.unsaved or noted or quoted < MOST_QUOTED:
                quoted += not noted
                add_note(cell, [_put_back(cell, formula, formulas.text(place))])
    if total:
        left = "" if quoted < MOST_QUOTED else f" (the first {MOST_QUOTED:,} of them)"
        made.changes.append(
            f"{total:,} formula{'s' if total > 1 else ''}: the copy holds the last stored values; "
            f"the comment of the cell quotes the formula{left}"
        )


def add_note(cell: Any, lines: Iterable[str]) -> None:
    """Add ``lines`` to the cell's comment, behind what the team wrote; never more than fits."""
    present = cell.comment.text if cell.comment is not None else ""
    own, _, ours = present.partition(SIGN)
    author = cell.comment.author if own.strip() else "drystone"
    before = [part for part in ours.strip().split("\n\n") if part]
    room = min(LONGEST_NOTE, LONGEST_COMMENT - len(own))
    text = f"{own.rstrip()}\n\n{SIGN}\n" if own.strip() else f"{SIGN}\n"
    text += _fitted([*before, *(clean(line) for line in lines)], room)
    cell.comment = Comment(text, author)
    size_box(cell.comment)


def forget_notes(made: Book) -> None:
    """Take out what an earlier marked copy said, for teams that went on working in one."""
    for sheet in made.book.worksheets:
        for cell in list(sheet._cells.values()):
            comment = getattr(cell, "_comment", None)
            if comment is None:
                continue
            own = comment.text.partition(SIGN)[0].rstrip()
            if own != comment.text:
                cell.comment = Comment(own, comment.author) if own else None
            if cell.comment is not None:
                size_box(cell.comment)


def size_box(comment: Comment) -> None:
    """Make the comment's box as tall as its text needs."""
    lines = sum(1 + len(line) // LETTERS for line in comment.text.split("\n"))
    comment.width, comment.height = WIDTH, min(TALLEST, 24 + LINE * lines)


def _fitted(lines: Sequence[str], room: int) -> str:
    kept: list[str] = []
    used = 0
    for line in lines:
        used += len(line) + 2
        if used > room - 40 and kept:
            break
        kept.append(clean(line, max(room - 40, 10)))
    more = len(lines) - len(kept)
    return "\n\n".join([*kept, f"and {more} more; see the list of findings"] if more else kept)


def _said(mark: Mark) -> str:
    todo = f"{mark.todo[:1].upper()}{mark.todo[1:]}"
    return f"{mark.level}, {mark.rule}: {mark.wrong.rstrip('.')}. {todo.rstrip('.')}."


def _put_back(cell: Any, formula: Formula, text: str) -> str:
    quoted = clean(text, 600) or "a formula that fills several cells"
    if not formula.unsaved:
        return f"formula: {quoted}\nThis copy holds the value that was stored last."
    if text and not formula.several and not OUTSIDE.search(text):
        cell.value = text
    return f"formula: {quoted}\nNo value was ever stored; open the workbook, calculate, save it."


def _anchor(sheet: Any, row: int, column: int) -> tuple[int, int]:
    """Give the cell that shows a place: in a merged range its first one."""
    if isinstance(sheet._cells.get((row, column)), MergedCell):
        for merged in sheet.merged_cells.ranges:
            if merged.min_row <= row <= merged.max_row and (
                merged.min_col <= column <= merged.max_col
            ):
                return merged.min_row, merged.min_col
    return row, column


def _is_hidden(cell: Any) -> bool:
    sheet = cell.parent
    if sheet.sheet_state != "visible":
        return True
    if cell.row in sheet.row_dimensions and sheet.row_dimensions[cell.row].hidden:
        return True
    return any(
        dimension.hidden and (dimension.min or 0) <= cell.column <= (dimension.max or 0)
        for dimension in sheet.column_dimensions.values()
    )
