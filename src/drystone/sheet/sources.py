"""Every table of a file as bare cells, before anybody knows what they mean."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from drystone.sheet.grid import Grid
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken
from drystone.sheet.read_csv import csv_grid
from drystone.sheet.read_workbook import open_workbook

WORKBOOKS = (".xlsx", ".xlsm", ".ods", ".xls", ".xlsb")  # the guard says what to do about the last


@dataclass(frozen=True)
class Source:
    """Cells of one sheet of a workbook, or of one CSV file.

    Parameters
    ----------
    grid : cells from A1
    broken : cells without a usable value, by (row, column) from 0
    """

    name: str
    grid: Grid
    broken: dict[tuple[int, int], Broken] = field(default_factory=dict)


def read_sources(path: Path) -> list[Source]:
    """Sheets of the workbook, or CSV files of the folder, or the one CSV file, at ``path``.

    Raises
    ------
    SheetProblem
        When there is nothing to read, or it is dangerous, damaged or of another kind.
    """
    if path.is_dir():
        files = sorted(item for item in path.iterdir() if item.suffix.lower() == ".csv")
        if not files:
            raise SheetProblem("holds no .csv file and is no review folder", str(path))
        return [_csv(item) for item in files]
    kind = path.suffix.lower()
    if kind in WORKBOOKS:
        grids, inspection = open_workbook(path)
        sources = [Source(n, _rows(g), inspection.broken.get(n, {})) for n, g in grids.items()]
        return [source for source in sources if source.broken or any(map(any, source.grid))]
    if kind == ".csv":
        return [_csv(path)]
    if not path.exists():
        raise SheetProblem("does not exist", str(path))
    raise SheetProblem("is none of .xlsx, .ods, .csv or a folder of CSV files", str(path))


def _csv(path: Path) -> Source:
    grid, broken, _ = csv_grid(path)
    return Source(path.name, grid, broken)


def _rows(grid: Sequence[Sequence[object]]) -> Grid:
    return [list(row) for row in grid]
