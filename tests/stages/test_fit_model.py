"""Fits of small invented tables: moderators, refusals as results, ledger of blank moderators."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from drystone.settings.model import Analysis, Inference
from drystone.stages.design_matrix import DesignProblem, design_matrix
from drystone.stages.fit_model import fit_rows

ANALYSIS = Analysis(outcome=("cover",))
NO_PAIRS = pd.DataFrame({"row_id": [], "other_row_id": [], "covariance": []})


def _rows(count: int = 24, studies: int = 8) -> pd.DataFrame:
    chance = np.random.default_rng(5)
    depth = chance.uniform(5, 30, count)
    return pd.DataFrame(
        {
            "row_id": [f"r{number}" for number in range(count)],
            "study": [f"Place {number % studies}" for number in range(count)],
            "effect": 0.1 + 0.02 * depth + chance.normal(0, 0.1, count),
            "sampling_variance": chance.uniform(0.005, 0.02, count),
            "crop": [("oats", "rye", "barley")[number % 3] for number in range(count)],
            "depth": depth,
        }
    )


def _fit(rows: pd.DataFrame, formula: str = "~ 1", analysis: Analysis = ANALYSIS, **options):
    return fit_rows(rows, NO_PAIRS, formula, analysis, Inference(**options))


def test_slope_is_found():
    table = _fit(_rows(), "~ depth").coefficients.set_index("coefficient")
    assert list(table.index) == ["intercept", "depth"]
    assert table.loc["depth", "ci_low"] < 0.02 < table.loc["depth", "ci_high"]
    assert table["pi_low"].isna().all()


def test_category_names_are_readable():
    table = _fit(_rows(), "~ crop").coefficients
    assert list(table["coefficient"]) == ["intercept", "crop = oats", "crop = rye"]


def test_model_without_intercept_gives_a_mean_for_each_category():
    table = _fit(_rows(), "~ 0 + crop").coefficients
    assert list(table["coefficient"]) == ["crop = barley", "crop = oats", "crop = rye"]
    assert table["refused"].isna().all()


def test_interaction_and_centring_have_readable_names():
    names = design_matrix("~ crop:center(depth)", _rows()).names
    assert all("[" not in name and "C(" not in name for name in names)


def test_rows_with_a_blank_moderator_go_to_the_ledger():
    rows = _rows()
    rows.loc[[2, 5], "depth"] = np.nan
    results = _fit(rows, "~ depth")
    assert results.coefficients["rows"].tolist() == [22, 22]
    assert results.ledger["row_id"].tolist() == ["r2", "r5"]
    assert set(results.ledger["rule"]) == {"blank moderator"}


@pytest.mark.parametrize(
    ("rows", "formula", "said"),
    [
        (_rows().iloc[:0], "~ 1", "no row is left"),
        (_rows(24, 24), "~ 1", "one row"),
        (_rows(4, 1), "~ 1", "stud"),
        (_rows().assign(crop="oats"), "~ crop", "one level only"),
        (_rows().assign(depth=np.nan), "~ depth", "every row is blank"),
        (_rows().assign(depth=-1.0), "~ log(depth)", "numbers above zero"),
        (_rows().assign(twice=lambda rows: 2 * rows["depth"]), "~ depth + twice", "twice"),
    ],
)
def test_refusals_are_results_with_a_sentence(rows, formula, said):
    table = _fit(rows, formula).coefficients
    assert len(table) == 1
    assert said in table["refused"].iloc[0]
    assert np.isnan(table["estimate"].iloc[0])


def test_few_studies_are_warned_about():
    table = _fit(_rows(12, 3)).coefficients
    assert "Too few studies" in table["warnings"].iloc[0]


def test_model_based_interval_on_request():
    table = _fit(_rows(), interval="model based").coefficients
    assert table["se"].iloc[0] == table["se_model"].iloc[0]
    assert table["df"].iloc[0] == 7


def test_confidence_level_is_used():
    wide = _fit(_rows(), confidence_percent=99.0).coefficients.iloc[0]
    narrow = _fit(_rows(), confidence_percent=80.0).coefficients.iloc[0]
    assert wide["ci_low"] < narrow["ci_low"] < narrow["ci_high"] < wide["ci_high"]


def test_order_of_rows_does_not_matter():
    there = _fit(_rows(), "~ depth").coefficients
    back = _fit(_rows().iloc[::-1].reset_index(drop=True), "~ depth").coefficients
    np.testing.assert_allclose(there["estimate"], back["estimate"], rtol=1e-9)
    np.testing.assert_allclose(there["se"], back["se"], rtol=1e-9)


def test_unknown_column_never_reaches_the_formula_library():
    with pytest.raises((DesignProblem, KeyError)):
        design_matrix("~ nothing", _rows())


def test_singular_sampling_covariance_fits_with_blank_heterogeneity():
    """Two rows that share both arms in number: the row level separates them, Q does not exist."""
    rows = _rows(12, 4)
    rows["sampling_variance"] = 0.02
    pairs = pd.DataFrame({"row_id": ["r0"], "other_row_id": ["r4"], "covariance": [0.02]})
    results = fit_rows(rows, pairs, "~ 1", ANALYSIS, Inference())
    assert results.coefficients["refused"].isna().all()
    assert np.isfinite(results.coefficients["estimate"].iloc[0])
    assert np.isnan(results.heterogeneity["q"].iloc[0])
    assert results.components["i2"].isna().all()


def test_refusal_names_rows_by_their_ids():
    """Rows 0 and 1 of the engine are r0 and r1 of the sheet."""
    rows = _rows(4, 2).assign(effect=0.3, sampling_variance=0.02, study=["A", "A", "B", "B"])
    pairs = pd.DataFrame(
        {"row_id": ["r0", "r2"], "other_row_id": ["r1", "r3"], "covariance": [0.02, 0.02]}
    )
    refused = fit_rows(rows, pairs, "~ 1", ANALYSIS, Inference()).coefficients["refused"].iloc[0]
    assert "r0" in refused
    assert "Rows 0" not in refused


def test_strategy_without_rows_gives_the_ledgers_reason(tmp_path):
    """No arm reports an SD: the refusal says this, not just that no row is left."""
    from drystone.settings.model import Strategy
    from drystone.stages import fill_spreads, fit_model
    from drystone.stages.slice_rows import settle_arms
    from drystone.tables.store import read_table, write_table

    count = 4
    rows = settle_arms(
        pd.DataFrame(
            {
                "row_id": [f"r{number}" for number in range(count)],
                "study": [f"Place {number // 2}" for number in range(count)],
                "outcome": "cover",
                "date": None,
                "control_id": None,
                "treatment_id": None,
                "control_mean": 10.0,
                "control_sd_value": np.nan,
                "control_n": 5.0,
                "treatment_mean": 12.0,
                "treatment_sd_value": np.nan,
                "treatment_n": 5.0,
                "sd_pooled": False,
            }
        )
    ).assign(flip=False)
    write_table(rows, tmp_path / "slice.parquet")
    strategy = Strategy(name="all cases", use="all cases")
    fill_spreads.run(tmp_path / "slice.parquet", ANALYSIS, strategy, tmp_path)
    where = (tmp_path / "slice.parquet", tmp_path)
    fit_model.run(*where, "~ 1", ANALYSIS, Inference(), tmp_path / "fit")
    refused = read_table(tmp_path / "fit/coefficients.parquet")["refused"].iloc[0]
    assert refused == "no arm of this analysis reports an SD, so there is no average CV"
