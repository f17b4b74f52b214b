"""Parquet and CSV: validated, byte-identical, atomic, harmless."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from drystone.tables import check, comparisons
from drystone.tables.csv_store import write_csv
from drystone.tables.store import TableError, conform, empty_table, read_table, write_table


def _ledger(**columns) -> pd.DataFrame:
    base = {
        "analysis": [None],
        "strategy": [None],
        "model": [None],
        "row_id": ["r1"],
        "study": ["Place 1"],
        "sheet": ["comparisons"],
        "sheet_row": [3],
        "rule": ["zero mean"],
        "reason": ["the mean is zero"],
    }
    return pd.DataFrame({**base, **columns})


def test_same_table_gives_the_same_bytes(tmp_path):
    for name in ("a", "b"):
        write_table(_ledger(), tmp_path / f"{name}.parquet", check.LEDGER)
    assert (tmp_path / "a.parquet").read_bytes() == (tmp_path / "b.parquet").read_bytes()


def test_round_trip_keeps_values_and_types(tmp_path):
    write_table(_ledger(), tmp_path / "t.parquet", check.LEDGER)
    back = read_table(tmp_path / "t.parquet", check.LEDGER)
    pd.testing.assert_frame_equal(back, conform(_ledger(), check.LEDGER))


def test_all_digits_survive_parquet(tmp_path):
    values = np.array([1 / 3, np.pi * 1e-12, np.nan, -0.0, 1e308])
    write_table(pd.DataFrame({"x": values}), tmp_path / "t.parquet")
    np.testing.assert_array_equal(read_table(tmp_path / "t.parquet")["x"], values)


@pytest.mark.parametrize(
    ("table", "said"),
    [
        (_ledger(rule=[None]), "rule"),
        (_ledger().drop(columns="reason"), "reason"),
        (_ledger(sheet_row=["three"]), "sheet_row"),
    ],
)
def test_wrong_table_is_refused_and_nothing_is_written(tmp_path, table, said):
    with pytest.raises(TableError, match=said):
        write_table(table, tmp_path / "t.parquet", check.LEDGER)
    assert list(tmp_path.iterdir()) == []


def test_unknown_level_of_a_finding_is_refused():
    row = {name: ["x"] for name in check.FINDINGS.columns} | {"level": ["fatal"]}
    with pytest.raises(TableError, match="level"):
        conform(pd.DataFrame(row), check.FINDINGS)


def test_empty_table_has_the_columns():
    assert list(empty_table(check.DERIVATIONS).columns) == list(check.DERIVATIONS.columns)


def test_csv_neutralises_formulas_and_keeps_numbers(tmp_path):
    table = pd.DataFrame(
        {"study": ["=1+1", "+x", "-y", "@z", "\tt", "plain"], "value": [-1.5, 2, 3, 4, 5, 1 / 3]}
    )
    write_csv(table, tmp_path / "t.csv")
    back = pd.read_csv(tmp_path / "t.csv")
    assert back["study"].tolist() == ["'=1+1", "'+x", "'-y", "'@z", "'\tt", "plain"]
    assert back["value"].tolist() == table["value"].tolist()


def test_every_column_of_the_sheet_has_description_and_use():
    for name, column in comparisons.COLUMNS.items():
        assert column.description, name
        assert column.metadata["use"] in ("numbers", "record"), name
