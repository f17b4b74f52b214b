"""Which lines of a sheet hold the headers: tried out, and the lines that explain most are taken."""

from __future__ import annotations

from collections.abc import Callable, Sequence

from drystone.settings.model import Layout
from drystone.sheet.grid import Grid, header_text
from drystone.sheet.guess.shapes import is_number_like
from drystone.sheet.laid_out import laid_out_table
from drystone.sheet.parse import MISSING_NUMBER
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawTable

DEEPEST, MOST_LINES = 20, 3
LOOKED_AT = 150  # rows below the headers that are enough to judge the lines by

Judge = Callable[[RawTable], tuple[float, tuple[int, ...]]]


def find_lines(name: str, grid: Grid, judge: Judge) -> tuple[float, Layout]:
    """Best score and the header lines that have it.

    Parameters
    ----------
    judge : score of a table, and the sheet's columns (from 0) that hold its numbers
    """
    best, numbers = (0.0, Layout(sheet=name, header_row=1)), tuple[int, ...]()
    for first in range(min(DEEPEST, len(grid))):
        if not _is_header(grid[first]):
            continue
        for count in range(1, MOST_LINES + 1):
            layout = Layout(sheet=name, header_row=first + 1, header_rows=count)
            if first + count > len(grid) or not _is_header(grid[first + count - 1], 1):
                break
            try:
                table, _ = laid_out_table(name, grid[: first + count + LOOKED_AT], {}, "", layout)
            except SheetProblem:
                break
            score, places = judge(table)
            score -= 0.5 * (count - 1)
            if score > best[0]:
                best, numbers = (score, layout), places
    return best[0], _with_units(grid, best[1], numbers)


def _is_header(row: Sequence[object], fewest: int = 2) -> bool:
    """Whether a row holds texts and hardly a number."""
    texts = [text for text in map(header_text, row) if text]
    filled = [text for text in texts if text.casefold() not in MISSING_NUMBER]
    numbers = sum(map(is_number_like, filled))
    return len(texts) >= fewest and numbers <= 0.2 * len(texts)


def _with_units(grid: Grid, layout: Layout, numbers: tuple[int, ...]) -> Layout:
    """Take a line of units or explanations below the headers to the headers."""
    first, count = (layout.header_row or 1) - 1, layout.header_rows
    if first + count >= len(grid) or count >= MOST_LINES or not numbers:
        return layout
    row = grid[first + count]
    texts = [header_text(row[place]) for place in numbers if place < len(row)]
    words = [t for t in texts if t.casefold() not in MISSING_NUMBER and not is_number_like(t)]
    odd = [word for word in words if any(sign.isdigit() for sign in word)]
    if 2 * len(words) >= len(numbers) and not odd:
        return layout.model_copy(update={"header_rows": count + 1})
    return layout
