"""A sheet that was read once, kept on disk: reads a folder of Parquet, writes the same.

Reading and checking a workbook takes seconds, and every process that looks at the review needs the
outcome. The folder's name is the digest of the file, of the reading options and of the reading
code, so a stored intake is never stale. One folder = one state of the sheet.
"""

from __future__ import annotations

import json
import os
import shutil
from pathlib import Path
from typing import TYPE_CHECKING

import pandas as pd

from drystone.tables.store import read_table, write_table

if TYPE_CHECKING:
    from drystone.sheet.intake import Intake

TABLES = ("rows", "studies", "findings", "accepted", "ledger", "derivations")


def save_intake(intake: Intake, folder: Path) -> None:
    """Write ``intake`` to ``folder`` in one move; an existing folder stays."""
    partial = folder.with_name(f".{folder.name}.{os.getpid()}")
    shutil.rmtree(partial, ignore_errors=True)
    try:
        for name in TABLES:
            write_table(getattr(intake, name), partial / f"{name}.parquet")
        facts = {"columns": intake.columns, "moderators": list(intake.moderators)}
        (partial / "columns.json").write_text(json.dumps(facts), encoding="utf-8")
        if not folder.exists():
            os.replace(partial, folder)
    finally:
        shutil.rmtree(partial, ignore_errors=True)


def load_table(folder: Path, name: str) -> pd.DataFrame:
    """One of the intake's tables: rows, studies, findings, ledger or derivations."""
    return read_table(folder / f"{name}.parquet")


def load_columns(folder: Path) -> dict[str, list[str]]:
    """Column letter and header, as typed, for each of drystone's columns."""
    found: dict[str, list[str]] = json.loads((folder / "columns.json").read_text("utf-8"))[
        "columns"
    ]
    return found
