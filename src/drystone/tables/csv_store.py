"""CSV files for people: safe to open in a spreadsheet program, never half written."""

from __future__ import annotations

from pathlib import Path

import pandas as pd

from drystone.tables.atomic import replacing

DANGEROUS = ("=", "+", "-", "@", "\t", "\r", "\n")


def neutral(value: object) -> object:
    """Text that a spreadsheet program would take for a formula, behind an apostrophe.

    Numbers stay numbers, also negative ones; only text cells can hide a formula.
    """
    if isinstance(value, str) and value.startswith(DANGEROUS):
        return f"'{value}"
    return value


def neutralised(table: pd.DataFrame) -> pd.DataFrame:
    """Copy of ``table`` whose text cells and headers cannot run as formulas."""
    safe = table.copy()
    for name in safe.columns:
        column = safe[name]
        if not pd.api.types.is_numeric_dtype(column.dtype):
            safe[name] = column.astype(object).map(neutral, na_action="ignore")
    safe.columns = pd.Index([neutral(str(name)) for name in safe.columns])
    return safe


def write_csv(table: pd.DataFrame, path: Path) -> None:
    """Write ``table`` as UTF-8 CSV in one move; numbers keep all their digits."""
    with replacing(path) as partial:
        neutralised(table).to_csv(partial, index=False, encoding="utf-8", lineterminator="\n")
