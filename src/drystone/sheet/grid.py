"""From a rectangle of cells to a table: header row, named columns, rows that hold something."""

from __future__ import annotations

import unicodedata
from collections.abc import Iterable, Iterator, Sequence

from drystone.sheet.notes import Note
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken, Cell, RawTable, letters, show
from drystone.words import levels

Grid = Sequence[Sequence[Cell]]


def table_from_grid(
    name: str, grid: Grid, broken: dict[tuple[int, int], Broken], file: str
) -> tuple[RawTable, list[Note]]:
    """Table of a grid whose first cell is A1, and what was odd about its shape.

    Parameters
    ----------
    broken : cells without a usable value, by (row, column) from 0

    Raises
    ------
    SheetProblem
        When no cell holds anything.
    """
    rows = [list(row) for row in grid] if broken else grid
    for (row, column), cell in broken.items():
        _put(rows, row, column, cell)  # type: ignore[arg-type]
    top = next((i for i, row in enumerate(rows) if any(map(_holds, row))), None)
    if top is None:
        raise SheetProblem("is empty; the first row must hold the column names", file, name)
    named = [(j, text) for j, text in enumerate(map(header_text, rows[top])) if text]
    body = list(_body(rows, top, [j for j, _ in named]))
    width = named[-1][0] + 1 if named else 0
    full = [_padded(rows[i], width) for i in body]
    table = RawTable(
        name=name,
        headers=tuple(text for _, text in named),
        positions=tuple(j for j, _ in named),
        columns=tuple([row[j] for row in full] for j, _ in named),
        row_numbers=tuple(i + 1 for i in body),
        header_row=top + 1,
    )
    return table, _unnamed(name, rows, top, {j for j, _ in named})


def header_text(cell: Cell) -> str:
    """Text of a header cell; blank for a cell without a usable value."""
    if isinstance(cell, Broken):
        return ""
    return unicodedata.normalize("NFC", " ".join(show(cell).split()))


def _holds(cell: Cell) -> bool:
    if cell is None or cell == "":
        return False
    return not isinstance(cell, str) or not cell.isspace()


def _padded(row: Sequence[Cell], width: int) -> Sequence[Cell]:
    return row if len(row) >= width else [*row, *[""] * (width - len(row))]


def _put(rows: list[list[Cell]], row: int, column: int, cell: Cell) -> None:
    while len(rows) <= row:
        rows.append([])
    rows[row].extend([""] * (column + 1 - len(rows[row])))
    rows[row][column] = cell


def _body(rows: Grid, top: int, places: Iterable[int]) -> Iterator[int]:
    wanted = list(places)
    for i in range(top + 1, len(rows)):
        row = rows[i]
        if any(_holds(row[j]) for j in wanted if j < len(row)):
            yield i


def _unnamed(name: str, rows: Grid, top: int, named: set[int]) -> list[Note]:
    width = max(map(len, rows))
    spare = [j for j in range(width) if j not in named]
    cells = [_first_value(rows, top, j) for j in spare]
    filled = [(j, i) for j, i in zip(spare, cells, strict=True) if i is not None]
    if not filled:
        return []
    column, row = filled[0]
    listed = ", ".join(letters(j) for j, _ in filled[:5]) + (" ..." if len(filled) > 5 else "")
    return [
        Note(
            levels.WARN,
            "unnamed column",
            f"column {listed} holds values but has no name in row {top + 1}; it is ignored",
            "give it a name in the header row, or clear it",
            cell=f"{letters(column)}{row + 1}",
            value=show(rows[row][column])[:200],
            sheet=name,
        )
    ]


def _first_value(rows: Grid, top: int, column: int) -> int | None:
    for i in range(top + 1, len(rows)):
        if column < len(rows[i]) and _holds(rows[i][column]):
            return i
    return None
