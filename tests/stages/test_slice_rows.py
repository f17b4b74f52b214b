"""Arms, borrowed SDs and filters of a slice (invented rows)."""

from __future__ import annotations

import numpy as np
import pandas as pd

from drystone.settings.model import Analysis
from drystone.stages.slice_rows import apply_filters, borrowed_sds, settle_arms, without_repeats


def _rows(**columns) -> pd.DataFrame:
    count = len(next(iter(columns.values())))
    base = {
        "row_id": [f"r{number}" for number in range(count)],
        "study": ["Place 1"] * count,
        "outcome": ["cover"] * count,
        "date": [None] * count,
        "control_id": ["c"] * count,
        "treatment_id": [f"t{number}" for number in range(count)],
        "control_mean": [10.0] * count,
        "control_sd_value": [2.0] * count,
        "control_n": [5.0] * count,
        "treatment_mean": [12.0] * count,
        "treatment_sd_value": [2.0] * count,
        "treatment_n": [5.0] * count,
        "sd_pooled": [False] * count,
    }
    return pd.DataFrame({**base, **columns})


def test_blank_sd_is_read_from_another_row_of_the_same_arm():
    table = settle_arms(_rows(control_sd_value=[np.nan, 2.0]))
    assert table["control_sd"].tolist() == [2.0, 2.0]
    assert table["control_sd_source"].tolist() == ["other row", "own"]
    assert table["control_arm"].nunique() == 1


def test_borrowed_sd_has_a_derivation_that_names_the_row():
    table = borrowed_sds(settle_arms(_rows(control_sd_value=[np.nan, 2.0])))
    (found,) = table.to_dict("records")
    assert (found["row_id"], found["arm"], found["sd"]) == ("r0", "control", 2.0)
    assert found["rule"] == "read from another row"
    assert found["inputs"] == "SD 2 of row r1"


def test_repeated_comparison_leaves_also_when_turned_round():
    rows = _rows(
        control_id=["a", "a", "b", "a"],
        treatment_id=["b", "b", "a", "c"],
        control_mean=[10.0, 10.0, 12.0, 10.0],
        treatment_mean=[12.0, 12.0, 10.0, 15.0],
    )
    kept, left = without_repeats(settle_arms(rows))
    assert kept["row_id"].tolist() == ["r0", "r3"]
    assert left["row_id"].tolist() == ["r1", "r2"]
    assert set(left["reason"]) == {"row r0 has the same two arms"}
    assert set(left["rule"]) == {"same comparison twice"}


def test_one_id_with_unlike_numbers_is_several_arms():
    table = settle_arms(_rows(control_mean=[10.0, 11.0], control_sd_value=[2.0, np.nan]))
    assert table["control_arm"].nunique() == 2
    assert np.isnan(table["control_sd"].iloc[1])


def test_dates_and_outcomes_are_different_arms():
    table = settle_arms(_rows(date=["2001", "2002"]))
    assert table["control_arm"].nunique() == 2
    table = settle_arms(_rows(outcome=["cover", "height"]))
    assert table["control_arm"].nunique() == 2


def test_treatment_that_is_a_control_elsewhere_is_the_same_arm():
    rows = _rows(
        control_id=["a", "b"],
        treatment_id=["b", "c"],
        control_mean=[10.0, 12.0],
        control_sd_value=[2.0, np.nan],
        treatment_sd_value=[3.0, 4.0],
    )
    table = settle_arms(rows)
    assert table["treatment_arm"].iloc[0] == table["control_arm"].iloc[1]
    assert table["control_sd"].iloc[1] == 3.0


def test_rows_without_ids_share_nothing():
    table = settle_arms(_rows(control_id=[None, None], treatment_id=[None, None]))
    assert pd.concat([table["control_arm"], table["treatment_arm"]]).nunique() == 4


def test_same_id_in_two_studies_is_two_arms():
    table = settle_arms(_rows(study=["Place 1", "Place 2"]))
    assert table["control_arm"].nunique() == 2


def test_filters_send_rows_to_the_ledger_with_the_reason():
    rows = _rows(crop=["oats", "rye", None], year=[1999.0, 2000.0, 2001.0])
    analysis = Analysis.model_validate(
        {"outcome": "cover", "where": {"crop": ["oats", "rye"]}, "where_not": {"year": 2000}}
    )
    kept, left = apply_filters(rows, analysis)
    assert kept["row_id"].tolist() == ["r0"]
    assert left.set_index("row_id")["reason"].to_dict() == {
        "r1": "year is '2000'",
        "r2": "crop is not 'oats' or 'rye'",
    }
