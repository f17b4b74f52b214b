"""Workbooks (.xlsx, .ods) as tables, always behind the guard."""

from __future__ import annotations

import io
from collections.abc import Mapping
from pathlib import Path
from typing import Any

from python_calamine import CalamineWorkbook, SheetTypeEnum

from drystone.settings.model import Layout
from drystone.settings.problems import nearest
from drystone.sheet import limits
from drystone.sheet.grid import table_from_grid
from drystone.sheet.guard import Inspection, inspect
from drystone.sheet.headers import has_needed
from drystone.sheet.laid_out import laid_out_table
from drystone.sheet.notes import Note
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawSheet, RawTable
from drystone.words import levels

Found = tuple[RawTable, list[Note]]


def read_workbook(path: Path, columns: Mapping[str, str], layout: Layout) -> RawSheet:
    """Read the comparisons (and studies) of the workbook at ``path``; see `readers.read_sheet`."""
    grids, inspection = open_workbook(path)
    tables = _tables(grids, inspection, str(path))
    if layout == Layout():
        name = _choose(tables, columns, str(path))
        comparisons, remarks = tables[name]
    else:
        name = _named(tables, layout, str(path)) or _choose(tables, columns, str(path))
        broken = inspection.broken.get(name, {})
        comparisons, remarks = laid_out_table(name, grids[name], broken, str(path), layout)
    studies = next((name for name in tables if name.strip().casefold() == "studies"), None)
    remarks = macros(inspection) + remarks
    if studies is None or studies == comparisons.name:
        return RawSheet(path.name, comparisons, None, tuple(remarks))
    table, more = tables[studies]
    return RawSheet(path.name, comparisons, table, tuple(remarks + more))


def open_workbook(path: Path) -> tuple[dict[str, Any], Inspection]:
    """Cells of every sheet of the workbook at ``path`` from A1, and what the guard saw.

    Raises
    ------
    SheetProblem
        When the file is absent, dangerous, damaged or no workbook.
    """
    content = limits.read_whole(path)
    inspection = inspect(content, str(path))
    return _grids(content, str(path)), inspection


def _named(tables: Mapping[str, Found], layout: Layout, file: str) -> str | None:
    if layout.sheet is None or layout.sheet in tables:
        return layout.sheet
    raise SheetProblem(
        f"has no sheet '{layout.sheet}' with data, which 'layout' in the config names: "
        f"{nearest(layout.sheet, tables)}",
        file,
    )


def _grids(content: bytes, file: str) -> dict[str, Any]:
    """Give the cells of every sheet from A1; a crash of the reader becomes a sentence."""
    try:
        workbook = CalamineWorkbook.from_filelike(io.BytesIO(content))
        return {
            sheet.name: workbook.get_sheet_by_name(sheet.name).to_python(skip_empty_area=False)
            for sheet in workbook.sheets_metadata
            if sheet.typ == SheetTypeEnum.WorkSheet
        }
    except (KeyboardInterrupt, SystemExit):
        raise
    except BaseException as error:  # the reader's own crash is no Exception
        raise SheetProblem(
            f"is damaged and cannot be read ({error}); open it in a spreadsheet program and save "
            "it again",
            file,
        ) from error


def _tables(grids: dict[str, Any], inspection: Inspection, file: str) -> dict[str, Found]:
    tables: dict[str, Found] = {}
    for name, grid in grids.items():
        broken = inspection.broken.get(name, {})
        if broken or any(any(cell != "" for cell in row) for row in grid):
            tables[name] = table_from_grid(name, grid, broken, file)
    return tables


def _choose(tables: Mapping[str, Found], columns: Mapping[str, str], file: str) -> str:
    candidates = [name for name in tables if name.strip().casefold() != "studies"]
    for name in candidates:
        if name.strip().casefold() == "comparisons":
            return name
    if len(candidates) == 1:
        return candidates[0]
    for name in candidates:
        if has_needed(tables[name][0], columns):
            return name
    if not candidates:
        raise SheetProblem("holds no sheet with data; add a sheet named 'comparisons'", file)
    listed = ", ".join(f"'{name}'" for name in candidates)
    raise SheetProblem(
        f"has several sheets ({listed}) and none is named 'comparisons' or holds the needed "
        "columns; rename the right one, or map its headers under 'columns' in the config",
        file,
    )


def macros(inspection: Inspection) -> list[Note]:
    """Remark about macros, when the workbook holds any."""
    if not inspection.macros:
        return []
    return [
        Note(
            levels.WARN,
            "macros",
            "the workbook holds macros; they are not run and only stored values are read",
            "save it as .xlsx when the macros are not needed",
        )
    ]
