"""Which rows and columns an analysis needs; used by the slice and by the key that guards it."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd

from drystone.settings.formulas import columns_of

if TYPE_CHECKING:
    from drystone.settings.model import Analysis

ALWAYS = (
    "row_id",
    "study",
    "outcome",
    "unit",
    "date",
    "control_id",
    "treatment_id",
    "control_mean",
    "control_sd_value",
    "control_n",
    "treatment_mean",
    "treatment_sd_value",
    "treatment_n",
    "sd_pooled",
)


def extra_columns(analysis: Analysis) -> tuple[str, ...]:
    """Columns that filters and formulas of ``analysis`` name, without those always needed."""
    named = [*analysis.where, *analysis.where_not]
    for formula in analysis.models.values():
        named.extend(columns_of(formula))
    return tuple(name for name in dict.fromkeys(named) if name not in ALWAYS)


def usable_rows(rows: pd.DataFrame, ledger: pd.DataFrame, analysis: Analysis) -> pd.DataFrame:
    """Rows of the analysis's outcomes that the check let through, needed columns only, by row_id.

    Filters are not applied here: a row that a filter leaves out must come into the ledger.
    """
    keep = rows["outcome"].isin(analysis.outcome) & ~rows["row_id"].isin(ledger["row_id"])
    columns = [*ALWAYS, *extra_columns(analysis)]
    return rows.loc[keep, columns].sort_values("row_id", kind="stable").reset_index(drop=True)
