"""CSV files as tables: UTF-8 (or an older code page), comma or semicolon."""

from __future__ import annotations

import csv
import io
from pathlib import Path

from drystone.settings.model import Layout
from drystone.sheet import limits
from drystone.sheet.code_pages import NAMES, decode_old
from drystone.sheet.decimal_commas import convert_commas
from drystone.sheet.grid import table_from_grid
from drystone.sheet.laid_out import laid_out_table
from drystone.sheet.notes import Note
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import ERROR_LITERALS, Broken, RawTable, letters
from drystone.words import levels


def read_csv(path: Path, layout: Layout | None = None) -> tuple[RawTable, list[Note]]:
    """Table of the CSV file at ``path``; ``layout`` says which lines hold the headers.

    Raises
    ------
    SheetProblem
        When the file is too large, no text, not separated by commas or semicolons, or empty.
    """
    grid, broken, notes = csv_grid(path)
    if layout is None or layout == Layout(sheet=layout.sheet):
        table, more = table_from_grid(path.name, grid, broken, str(path))
    else:
        table, more = laid_out_table(path.name, grid, broken, str(path), layout)
    return table, notes + more


def csv_grid(path: Path) -> tuple[list[list[str]], dict[tuple[int, int], Broken], list[Note]]:
    """Cells of the CSV file at ``path``, its error values, and what was converted; see above."""
    text, notes = _text(path)
    delimiter = _delimiter(text, path.name)
    grid = _records(text, path.name, delimiter)
    if delimiter == ";":
        notes += [_semicolons(path.name), *convert_commas(grid, path.name)]
    broken = {
        (i, j): Broken(cell)
        for i, row in enumerate(grid)
        for j, cell in enumerate(row)
        if cell[:1] == "#" and cell.strip() in ERROR_LITERALS
    }
    return grid, broken, notes


def _semicolons(name: str) -> Note:
    wrong = "the cells are separated by semicolons, not by commas; the file was read so"
    return Note(levels.FIXED, "semicolons", wrong, "nothing", sheet=name)


def _text(path: Path) -> tuple[str, list[Note]]:
    content = limits.read_whole(path)
    if content[:2] in (b"\xff\xfe", b"\xfe\xff") or b"\0" in content:
        raise SheetProblem("is UTF-16 or no text at all; save it as 'CSV UTF-8'", str(path))
    try:
        return content.decode("utf-8-sig"), []
    except UnicodeDecodeError as error:
        line = content.count(b"\n", 0, error.start) + 1
    found = decode_old(content)
    if found is None:
        raise SheetProblem(
            f"line {line} is not UTF-8 text; save the file as 'CSV UTF-8'", str(path)
        )
    text, page = found
    return text, [
        Note(
            levels.WARN,
            "not UTF-8",
            f"the file is not UTF-8 (line {line}); it was read as {NAMES[page]}, so accented "
            "letters may be wrong",
            "save it as 'CSV UTF-8'",
            sheet=path.name,
        )
    ]


def _records(text: str, name: str, delimiter: str) -> list[list[str]]:
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
