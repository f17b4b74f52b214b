"""Every table of a file as bare cells, before anybody knows what they mean."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from drystone.settings.model import Layout
from drystone.sheet.grid import Grid, table_from_grid
from drystone.sheet.laid_out import laid_out_table
from drystone.sheet.notes import Note
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken, RawSheet
from drystone.sheet.read_csv import csv_grid
from drystone.sheet.read_workbook import macros, open_workbook

WORKBOOKS = (".xlsx", ".xlsm", ".ods", ".xls", ".xlsb")  # the guard says what to do about the last


@dataclass(frozen=True)
class Source:
    """Cells of one sheet of a workbook, or of one CSV file.

    Parameters
    ----------
    grid : cells from A1
    broken : cells without a usable value, by (row, column) from 0
    remarks : what the reader noticed
    """

    name: str
    grid: Grid
    broken: dict[tuple[int, int], Broken] = field(default_factory=dict)
    remarks: tuple[Note, ...] = ()


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
        said = tuple(macros(inspection))
        sources = [
            Source(name, _rows(grid), inspection.broken.get(name, {}), said)
            for name, grid in grids.items()
        ]
        return [source for source in sources if source.broken or any(map(any, source.grid))]
    if kind == ".csv":
        return [_csv(path)]
    if not path.exists():
        raise SheetProblem("does not exist", str(path))
    raise SheetProblem("is none of .xlsx, .ods, .csv or a folder of CSV files", str(path))


def raw_sheet(sources: Sequence[Source], layout: Layout, file: str) -> RawSheet:
    """Tables that `readers.read_sheet` would give for the same file and layout, read only once.

    Parameters
    ----------
    layout : names the sheet when there are several
    """
    chosen = next(s for s in sources if layout.sheet in (None, s.name))
    comparisons, remarks = laid_out_table(chosen.name, chosen.grid, chosen.broken, file, layout)
    said = [*chosen.remarks, *remarks]
    for source in sources:
        if source is not chosen and source.name.strip().casefold() in ("studies", "studies.csv"):
            studies, more = table_from_grid(source.name, source.grid, source.broken, file)
            own = [note for note in source.remarks if note not in said]
            return RawSheet(file, comparisons, studies, (*said, *own, *more))
    return RawSheet(file, comparisons, None, tuple(said))


def _csv(path: Path) -> Source:
    grid, broken, remarks = csv_grid(path)
    return Source(path.name, grid, broken, tuple(remarks))


def _rows(grid: Sequence[Sequence[object]]) -> Grid:
    return [list(row) for row in grid]
