"""Decimal commas of files whose cells are separated by semicolons."""

from __future__ import annotations

import re
from collections.abc import Iterator

from drystone.sheet.notes import Note
from drystone.sheet.parse import MISSING_NUMBER
from drystone.sheet.raw import letters
from drystone.words import levels

_COMMA = re.compile(r"\s*[+-]?\d*,\d+\s*", re.ASCII)
_POINT = re.compile(r"\s*[+-]?\d*\.\d+([eE][+-]?\d+)?\s*", re.ASCII)
_THOUSANDS = re.compile(r"\s*[+-]?[1-9]\d{0,2},\d{3}\s*", re.ASCII)
_WHOLE = re.compile(r"\s*[+-]?\d+\s*", re.ASCII)
NUMBERS = 0.5  # share of numbers from which a column counts as numbers

Place = tuple[int, int]


def convert_commas(grid: list[list[str]], name: str) -> list[Note]:
    """Turn decimal commas of number columns into points, in place, and say so.

    Nothing is converted when the file also holds decimal points, or when every comma could
    separate thousands; such cells are then findings of their own.
    """
    places = [place for column in _number_columns(grid) for place in column]
    commas = [(i, j) for i, j in places if _COMMA.fullmatch(grid[i][j])]
    points = any(_POINT.fullmatch(cell) for row in grid for cell in row)
    if not commas or points or all(_THOUSANDS.fullmatch(grid[i][j]) for i, j in commas):
        return []
    row, column = commas[0]
    typed = grid[row][column]
    for i, j in commas:
        grid[i][j] = grid[i][j].replace(",", ".")
    return [
        Note(
            levels.FIXED,
            "decimal commas",
            f"{len(commas)} numbers have a decimal comma and no cell has a decimal point; they "
            f"were read with a point, '{typed.strip()}' as {grid[row][column].strip()}",
            "nothing, unless the commas separate thousands",
            cell=f"{letters(column)}{row + 1}",
            value=typed,
            sheet=name,
        )
    ]


def _number_columns(grid: list[list[str]]) -> Iterator[list[Place]]:
    """Filled cells below the first row of every column in which numbers prevail."""
    for column in range(max(map(len, grid), default=0)):
        filled = [
            (i, column)
            for i, row in enumerate(grid)
            if i and column < len(row) and row[column].strip().casefold() not in MISSING_NUMBER
        ]
        numbers = [
            place
            for place in filled
            if _COMMA.fullmatch(grid[place[0]][column]) or _WHOLE.fullmatch(grid[place[0]][column])
        ]
        if filled and len(numbers) > NUMBERS * len(filled):
            yield filled
