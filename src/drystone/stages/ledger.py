"""Ledger entries for rows that leave below the check."""

from __future__ import annotations

import pandas as pd

from drystone.tables.check import LEDGER
from drystone.tables.store import conform, empty_table


def ledger_rows(rows: pd.DataFrame, rule: str, reasons: pd.Series | str) -> pd.DataFrame:
    """Entries for ``rows`` (needs row_id and study); addresses are filled in when published."""
    if rows.empty:
        return empty_table(LEDGER)
    table = pd.DataFrame(dict.fromkeys(LEDGER.columns), index=rows.index)
    table["row_id"], table["study"] = rows["row_id"], rows["study"]
    table["rule"], table["reason"] = rule, reasons
    table["sheet_row"] = 0
    return conform(table, LEDGER)
