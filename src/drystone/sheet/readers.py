"""From a workbook or a folder of CSV files to the tables as typed."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path

from drystone.settings.model import Layout
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawSheet
from drystone.sheet.read_csv import read_csv
from drystone.sheet.read_workbook import read_workbook

WORKBOOKS = (".xlsx", ".xlsm", ".ods")
REFUSED = (".xls", ".xlsb")  # the guard says what to do about them


def read_sheet(
    path: Path, columns: Mapping[str, str] | None = None, layout: Layout | None = None
) -> RawSheet:
    """Read the extraction sheet at ``path``.

    Parameters
    ----------
    path : .xlsx, .xlsm or .ods workbook, folder with comparisons.csv (and studies.csv), or one
        CSV file
    columns : the config's map, ours: theirs; helps to tell which sheet holds the comparisons
    layout : which sheet, and which lines hold the headers

    Raises
    ------
    SheetProblem
        When the file is absent, dangerous, damaged, of another kind, or holds no comparisons.
    """
    layout = layout or Layout()
    if path.is_dir():
        return _read_folder(path, layout)
    kind = path.suffix.lower()
    if kind in (*WORKBOOKS, *REFUSED):
        return read_workbook(path, dict(columns or {}), layout)
    if kind == ".csv":
        table, remarks = read_csv(path, layout)
        return RawSheet(path.name, table, None, tuple(remarks))
    if not path.exists():
        raise SheetProblem(
            "does not exist; put the extraction sheet there, or change 'sheet' in the config",
            str(path),
        )
    raise SheetProblem(
        "is none of .xlsx, .ods, .csv or a folder of CSV files; save the sheet as .xlsx", str(path)
    )


def _read_folder(path: Path, layout: Layout) -> RawSheet:
    files = {item.name.casefold(): item for item in sorted(path.iterdir()) if item.is_file()}
    wanted = (layout.sheet or "comparisons.csv").casefold()
    if wanted not in files:
        inside = ", ".join(sorted(item.name for item in files.values())[:10]) or "nothing"
        named = layout.sheet or "comparisons.csv"
        raise SheetProblem(f"holds no {named} (it holds {inside})", str(path))
    comparisons, remarks = read_csv(files[wanted], layout)
    if "studies.csv" not in files or wanted == "studies.csv":
        return RawSheet(path.name, comparisons, None, tuple(remarks))
    studies, more = read_csv(files["studies.csv"])
    return RawSheet(path.name, comparisons, studies, tuple(remarks + more))
