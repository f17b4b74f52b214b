"""Mark: reads the sheet and its stored intake -> writes the marked copy of the sheet.

A step of its own: it takes longer than the check itself on a large sheet, and nothing but the
results folder waits for it.
"""

from __future__ import annotations

from pathlib import Path

from drystone.sheet.marked_copy.write import write_marked_copy
from drystone.stages.intake_store import load_columns, load_table
from drystone.tables.atomic import replacing


def run(sheet: Path, intake: Path, target: Path) -> None:
    """Write the marked copy of ``sheet`` to ``target`` in one move.

    Parameters
    ----------
    sheet : workbook, CSV file or folder of CSV files; only read
    intake : folder of the stored intake of this state of the sheet

    Raises
    ------
    SheetProblem
        When the sheet cannot be read any more.
    """
    findings, rows = (load_table(intake, name) for name in ("findings", "rows"))
    with replacing(target) as partial:
        write_marked_copy(sheet, findings, rows, load_columns(intake), partial)
