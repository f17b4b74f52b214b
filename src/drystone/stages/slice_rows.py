"""Slice: reads the stored intake -> writes the rows of one analysis, with arms and SDs settled.

A physical arm gets one code and one SD in every row that uses it. A blank SD of an arm that
reports one in another row is read from there.
"""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd
import pandera.pandas as pa

from drystone.stages.intake_store import load_table
from drystone.stages.ledger import ledger_rows
from drystone.stages.select_rows import extra_columns, usable_rows
from drystone.tables.check import DERIVATIONS, LEDGER
from drystone.tables.effects import SLICE, SLICE_COLUMNS
from drystone.tables.store import conform, write_table
from drystone.words.arms import ARMS, CONTROL, TREATMENT

if TYPE_CHECKING:
    from drystone.settings.model import Analysis, Outcome


def run(intake: Path, analysis: Analysis, outcomes: dict[str, Outcome], target: Path) -> None:
    """Write slice, ledger and derivations to the folder ``target``.

    The ledger holds the rows that the filters leave out and those that repeat a comparison, the
    derivations every borrowed SD.
    """
    rows = usable_rows(load_table(intake, "rows"), load_table(intake, "ledger"), analysis)
    kept, filtered = apply_filters(rows, analysis)
    table, repeated = without_repeats(settle_arms(kept))
    left = conform(pd.concat([filtered, repeated], ignore_index=True), LEDGER)
    table["flip"] = table["outcome"].map({name: item.flip_sign for name, item in outcomes.items()})
    table["flip"] = table["flip"].astype(bool)
    extra = [name for name in extra_columns(analysis) if name not in SLICE_COLUMNS]
    chosen = table[list(SLICE_COLUMNS) + extra]
    write_table(chosen, target / "slice.parquet", _with_extra(extra))
    write_table(left, target / "ledger.parquet", LEDGER)
    write_table(borrowed_sds(table), target / "derivations.parquet", DERIVATIONS)


def apply_filters(rows: pd.DataFrame, analysis: Analysis) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Split ``rows`` into those that pass the equality filters and ledger entries of the rest."""
    reasons = pd.Series("", index=rows.index, dtype=object)
    for column, allowed in analysis.where.items():
        out = ~as_text(rows[column]).isin(allowed) & (reasons == "")
        reasons[out] = f"{column} is not {_either(allowed)}"
    for column, refused in analysis.where_not.items():
        out = as_text(rows[column]).isin(refused) & (reasons == "")
        reasons[out] = f"{column} is {_either(refused)}"
    out = reasons != ""
    left = ledger_rows(rows[out], "filtered out", reasons[out])
    return rows[~out].reset_index(drop=True), left


def settle_arms(rows: pd.DataFrame) -> pd.DataFrame:
    """Give every row its arms' codes and SDs; see the module's text."""
    table = rows.copy()
    arms = _long(rows)
    arms["arm"] = _arm_codes(arms)
    arms["sd_settled"] = arms.groupby("arm")["sd"].transform("first")
    own, settled = arms["sd"].notna(), arms["sd_settled"].notna()
    arms["source"] = np.select([own, settled], ["own", "other row"], "none")
    arms["pooled"] = arms.groupby("arm")["pooled"].transform("max")
    for role in ARMS:
        part = arms[arms["role"] == role].reset_index(drop=True)
        table[f"{role}_arm"] = part["arm"]
        table[f"{role}_sd"] = part["sd_settled"]
        table[f"{role}_sd_source"] = part["source"]
        table[f"{role}_sd_pooled"] = part["pooled"].astype(bool)
    return table


def without_repeats(table: pd.DataFrame) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Split into the first row of every pair of arms and ledger entries of its repeats.

    Two rows with the same two physical arms are one comparison, also when it is turned round.
    Together they would make the sampling covariance singular and drive the row variance to zero.
    """
    sides = zip(table["control_arm"], table["treatment_arm"], strict=True)
    pairs = pd.Series(["\n".join(sorted(pair)) for pair in sides], index=table.index, dtype=object)
    again = pairs.duplicated()
    first = table["row_id"].groupby(pairs).transform("first")
    reasons = "row " + first[again].astype(object) + " has the same two arms"
    left = ledger_rows(table[again], "same comparison twice", reasons)
    return table[~again].reset_index(drop=True), left


def borrowed_sds(table: pd.DataFrame) -> pd.DataFrame:
    """Derivation of every SD that was read from another row of the same physical arm."""
    donors: dict[str, str] = {}
    for role in ARMS:
        own = table[table[f"{role}_sd_source"] == "own"]
        donors = dict(zip(own[f"{role}_arm"], own["row_id"], strict=True)) | donors
    found = []
    for role in ARMS:
        for row in table[table[f"{role}_sd_source"] == "other row"].to_dict("records"):
            arm, sd = row[f"{role}_arm"], row[f"{role}_sd"]
            found.append(
                {
                    "row_id": row["row_id"],
                    "study": row["study"],
                    "arm": role,
                    "sd": sd,
                    "rule": "read from another row",
                    "inputs": f"SD {sd:g} of row {donors[arm]}",
                    "assumptions": "both rows name this arm, with the same mean and n",
                }
            )
    return conform(pd.DataFrame(found, columns=list(DERIVATIONS.columns)), DERIVATIONS)


def _long(rows: pd.DataFrame) -> pd.DataFrame:
    """One row per arm of each comparison: controls first, then treatments."""
    parts = []
    for role in (CONTROL, TREATMENT):
        parts.append(
            pd.DataFrame(
                {
                    "role": role,
                    "row_id": rows["row_id"],
                    "study": rows["study"],
                    "outcome": rows["outcome"],
                    "date": rows["date"].astype(object).where(rows["date"].notna(), ""),
                    "id": rows[f"{role}_id"].astype(object),
                    "mean": rows[f"{role}_mean"],
                    "n": rows[f"{role}_n"],
                    "sd": rows[f"{role}_sd_value"],
                    "pooled": rows["sd_pooled"].astype(bool),
                }
            )
        )
    return pd.concat(parts, ignore_index=True)


def _arm_codes(arms: pd.DataFrame) -> pd.Series:
    """Code of each physical arm; one id with unlike numbers is several arms (a finding says so)."""
    codes = arms["row_id"] + " | " + arms["role"]
    named = arms["id"].notna()
    keys = ["study", "outcome", "date", "id"]
    for key, group in arms[named].groupby(keys, sort=False, dropna=False):
        base = " | ".join(str(part) for part in key if str(part))
        for number, index in enumerate(_same_numbers(group)):
            codes[index] = base if number == 0 else f"{base} #{number + 1}"
    return codes


def _same_numbers(group: pd.DataFrame) -> list[pd.Index]:
    """Split rows of one arm id by mean, n and SD; a blank SD goes with the first that fits."""
    found: list[pd.Index] = []
    for _, same in group.groupby(["mean", "n"], sort=False, dropna=False):
        values = same["sd"].dropna().unique()
        if len(values) <= 1:
            found.append(same.index)
            continue
        blank = same.index[same["sd"].isna()]
        for position, value in enumerate(values):
            index = same.index[same["sd"] == value]
            found.append(index.union(blank) if position == 0 else index)
    return found


def _with_extra(extra: list[str]) -> pa.DataFrameSchema:
    return SLICE.add_columns({name: pa.Column(None, nullable=True) for name in extra})


def as_text(column: pd.Series) -> pd.Series:
    """Values as a filter of the config names them: numbers without idle zeros, blank as ''."""
    if pd.api.types.is_numeric_dtype(column.dtype):
        return column.map(lambda value: "" if pd.isna(value) else f"{value:g}")
    return column.astype(object).where(column.notna(), "")


def _either(values: tuple[str, ...]) -> str:
    return " or ".join(f"'{value}'" for value in values)
