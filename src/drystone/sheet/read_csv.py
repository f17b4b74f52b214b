"""CSV files as tables: UTF-8 (or the older Western code page), comma or semicolon."""

from __future__ import annotations

import csv
import io
from pathlib import Path

from drystone.sheet import limits
from drystone.sheet.grid import table_from_grid
from drystone.sheet.notes import Note
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import ERROR_LITERALS, Broken, RawTable, letters
from drystone.words import levels


def read_csv(path: Path) -> tuple[RawTable, list[Note]]:
    """Table of the CSV file at ``path``.

    Raises
    ------
    SheetProblem
        When the file is too large, no text, not separated by commas or semicolons, or empty.
    """
    text, notes = _text(path)
    grid = _records(text, path.name)
    broken = {
        (i, j): Broken(cell)
        for i, row in enumerate(grid)
        for j, cell in enumerate(row)
        if cell[:1] == "#" and cell.strip() in ERROR_LITERALS
    }
    table, more = table_from_grid(path.name, grid, broken, str(path))
    return table, notes + more


def _text(path: Path) -> tuple[str, list[Note]]:
    content = limits.read_whole(path)
    if content[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\0" in content:
        raise SheetProblem("is UTF-16 or no text at all; save it as 'CSV UTF-8'", str(path))
    try:
        return content.decode("utf-8-sig"), []
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
    try:
        text = content.decode("cp1252")
    except UnicodeDecodeError as error:
        raise SheetProblem(
            f"line {line} is not UTF-8 text; save the file as 'CSV UTF-8'", str(path)
        ) from error
    return text, [
        Note(
            levels.WARN,
            "not UTF-8",
            f"the file is not UTF-8 (line {line}); it was read in the Western European code page, "
            "so accented letters may be wrong",
            "save it as 'CSV UTF-8'",
            sheet=path.name,
        )
    ]


def _records(text: str, name: str) -> list[list[str]]:
    delimiter = _delimiter(text, name)
    grid: list[list[str]] = []
    cells = 0
    try:
        for row in csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True):
            grid.append(row)
            cells += len(row)
            if len(grid) > limits.MOST_ROWS or len(row) > limits.MOST_COLUMNS:
                address = f"{letters(len(row) - 1 if row else 0)}{len(grid)}"
                raise SheetProblem(limits.too_wide(), name, cell=address)
            if cells > limits.MOST_CELLS:
                raise SheetProblem(limits.too_many_cells(), name)
    except csv.Error as error:
        raise SheetProblem(
            f"cannot be split into cells near record {len(grid) + 1} ({error}); look for a quote "
            "that is not closed",
            name,
        ) from error
    return grid


def _delimiter(text: str, name: str) -> str:
    """Take the sign that splits the first line into more cells, quoted text apart."""
    first = next((line for line in text.splitlines() if line.strip(" ,;\t")), "")
    outside = "".join(first.split('"')[::2])
    if "\t" in outside and "," not in outside and ";" not in outside:
        raise SheetProblem("is separated by tabs; save it with commas or semicolons", name)
    return ";" if outside.count(";") > outside.count(",") else ","
