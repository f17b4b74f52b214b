"""What every strategy returns, and the parts that several strategies share."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd

from drystone.stages.ledger import ledger_rows
from drystone.tables.check import LEDGER
from drystone.tables.effects import AVERAGES
from drystone.tables.store import empty_table
from drystone.words.arms import ARMS


class NothingReported(ValueError):
    """No arm reports an SD, so a strategy that needs an average CV has none."""


@dataclass(frozen=True)
class Filled:
    """Rows that a strategy uses, with a squared CV for both arms.

    Parameters
    ----------
    rows : slice rows that stay, plus control_cv2, treatment_cv2 and their ``_cv_source``
    ledger : entries of the rows that leave
    averages : tables.effects.AVERAGES, empty when the strategy plugs nothing in
    """

    rows: pd.DataFrame
    ledger: pd.DataFrame
    averages: pd.DataFrame


def own_cv2(rows: pd.DataFrame, arm: str) -> pd.Series:
    """Squared CV from the arm's own numbers, blank without an SD."""
    return (rows[f"{arm}_sd"] / rows[f"{arm}_mean"]) ** 2


def has_both_sds(rows: pd.DataFrame) -> pd.Series:
    """Rows whose two arms have an SD and whose variance is not zero."""
    sds = [rows[f"{arm}_sd"] for arm in ARMS]
    return sds[0].notna() & sds[1].notna() & (sds[0].fillna(0) + sds[1].fillna(0) > 0)


def only_complete(rows: pd.DataFrame) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Split into rows with both SDs and ledger entries of the rest."""
    complete = has_both_sds(rows)
    lacking = rows[~complete]
    reasons = pd.Series(
        [_lacking(row) for row in lacking[["control_sd", "treatment_sd"]].itertuples()],
        index=lacking.index,
        dtype=object,
    )
    return rows[complete].reset_index(drop=True), ledger_rows(lacking, "no spread", reasons)


def with_cv2(rows: pd.DataFrame, values: dict[str, np.ndarray], average: bool) -> pd.DataFrame:
    """Rows plus squared CVs: own where reported, else (or always) the average.

    Parameters
    ----------
    values : average squared CV by arm, (k,) each
    average : True plugs the average into every row
    """
    table = rows.copy()
    for arm in ARMS:
        own = own_cv2(rows, arm)
        plug = own.isna() | average
        table[f"{arm}_cv2"] = np.where(plug, values[arm], own)
        table[f"{arm}_cv_source"] = np.where(plug, "average", "own")
    return table


def no_averages() -> pd.DataFrame:
    """Empty table of averages."""
    return empty_table(AVERAGES)


def no_ledger() -> pd.DataFrame:
    """Empty ledger."""
    return empty_table(LEDGER)


def _lacking(row: object) -> str:
    missing = [arm for arm in ARMS if np.isnan(getattr(row, f"{arm}_sd"))]
    if not missing:
        return "both SDs are zero"
    if len(missing) == len(ARMS):
        return "neither arm reports an SD"
    return f"the {missing[0]} arm reports no SD"
