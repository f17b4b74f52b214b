"""The twelve-row sheet of the formula sheet, through the whole workflow.

Expected numbers: tests/reference/checks.json (invented inputs; computed there with mpmath at 34
digits, printed to 15).
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from reference.formula_sheet import check
from workflow.reviews import mini_sheet, run_review, summary, write_review

ORDERS = ("first", "second")


@pytest.fixture(scope="module")
def review(tmp_path_factory):
    root = tmp_path_factory.mktemp("mini")
    config = {
        "outcomes": {"biomass": {"scale": "ratio"}},
        "analyses": {order: {"outcome": "biomass", "order": order} for order in ORDERS},
        "strategies": [
            "complete cases",
            {"missing cases": {"average_cv": "mean of squares"}},
            {"all cases": {"average_cv": "mean of squares"}},
        ],
    }
    write_review(root, mini_sheet(), config)
    run_review(root)
    return root


def _row(review, analysis: str, strategy: str) -> pd.Series:
    table = summary(review)
    found = table[(table["analysis"] == analysis) & (table["strategy"] == strategy)]
    assert len(found) == 1
    return found.iloc[0]


@pytest.mark.parametrize(
    ("name", "analysis", "strategy"),
    [
        ("fit.complete_case", "first", "complete cases"),
        ("fit.missing_cases.first", "first", "missing cases"),
        ("fit.missing_cases.second", "second", "missing cases"),
        ("fit.all_cases.first", "first", "all cases"),
        ("fit.all_cases.second", "second", "all cases"),
    ],
)
def test_fit_matches_formula_sheet(review, name, analysis, strategy):
    expected = check(name)["expect"]
    row = _row(review, analysis, strategy)
    found = [row["estimate"], row["se_model"], row["var_study"], row["var_row"]]
    wanted = [float(v) for v in (expected["mu"], expected["se"], *expected["theta"])]
    np.testing.assert_allclose(found, wanted, rtol=1e-9)  # LINEAR_SOLVE; the engine polishes
    np.testing.assert_allclose(row["log_likelihood"], float(expected["loglik"]), rtol=1e-9)


def test_cluster_robust_interval_matches_formula_sheet(review):
    expected = check("cr2.intercept")["expect"]
    row = _row(review, "first", "all cases")
    found = [row["se"], row["df"], row["ci_low"], row["ci_high"]]
    wanted = [float(v) for v in (expected["se_cr2"], expected["df"], *expected["ci"])]
    np.testing.assert_allclose(found, wanted, rtol=1e-9)


def test_prediction_interval_matches_formula_sheet(review):
    expected = [float(v) for v in check("prediction.sheet")["expect"]["t_studies_minus_1"]]
    row = _row(review, "first", "all cases")
    np.testing.assert_allclose([row["pi_low"], row["pi_high"]], expected, rtol=1e-9)


@pytest.mark.parametrize("order", ORDERS)
@pytest.mark.parametrize(
    ("name", "strategy"),
    [("sheet.V_missing_cases", "missing cases"), ("sheet.V_all_cases", "all cases")],
)
def test_sampling_variances_match_formula_sheet(review, order, name, strategy):
    expected = check(name)["expect"]
    folder = review / "cache" / "analyses" / order / strategy
    table = pd.read_parquet(folder / "sampling.parquet").set_index("row_id")
    rows = [f"r{number}" for number in range(1, 13)]
    wanted = np.array([float(v) for v in expected[f"diag_{order}"]])
    np.testing.assert_allclose(table.loc[rows, "sampling_variance"], wanted, rtol=1e-10)
    pairs = pd.read_parquet(folder / "covariance.parquet")
    found = {
        frozenset(ids): value
        for *ids, value in pairs[["row_id", "other_row_id", "covariance"]].itertuples(index=False)
    }
    assert set(found) == {frozenset(("r1", "r2")), frozenset(("r7", "r8"))}
    for pair in (("r1", "r2"), ("r7", "r8")):
        key = f"cov_{pair[0]}_{pair[1]}_{order}"
        if key in expected:
            np.testing.assert_allclose(found[frozenset(pair)], float(expected[key]), rtol=1e-10)


def test_average_cvs_match_formula_sheet(review):
    """Both readings of the average, over unique arms (`sheet.average_cv2`)."""
    expected = check("sheet.average_cv2")["expect"]
    table = pd.read_parquet(review / "cache/analyses/first/all cases/averages.parquet")
    found = table.set_index(["arm", "version"])["cv2"]
    np.testing.assert_allclose(
        [found["treatment", "mean of squares"], found["control", "mean of squares"]],
        [float(expected["nweighted_T"]), float(expected["unique_control_nweighted_C"])],
        rtol=1e-10,
    )
    np.testing.assert_allclose(
        found["treatment", "square of mean"],
        float(expected["square_of_nweighted_CV_T"]),
        rtol=1e-10,
    )


def test_row_level_effects_match_formula_sheet(review):
    expected = [float(v) for v in check("sheet.lnrr")["expect"]["y"]]
    table = pd.read_parquet(review / "cache/analyses/first/effects.parquet").set_index("row_id")
    rows = [f"r{number}" for number in range(1, 13)]
    np.testing.assert_allclose(table.loc[rows, "effect_first"], expected, rtol=1e-10)


def test_ledger_balances_for_every_strategy(review):
    ledger = pd.read_csv(review / "results" / "tables" / "ledger.csv")
    table = summary(review)
    for _, row in table.iterrows():
        applies = (
            (ledger["analysis"].isna() | (ledger["analysis"] == row["analysis"]))
            & (ledger["strategy"].isna() | (ledger["strategy"] == row["strategy"]))
            & (ledger["model"].isna() | (ledger["model"] == row["model"]))
        )
        assert row["rows"] + ledger[applies]["row_id"].nunique() == 12
