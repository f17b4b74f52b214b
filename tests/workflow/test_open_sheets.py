"""Open data sets through the whole workflow, against brute-force fits of the same rows.

Sources and licences: tests/reference/open_data/README.md. The other sets are read from the folder
`shared/data` beside the repository when it is there.
"""

from __future__ import annotations

import json
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from workflow.reviews import REFERENCE, SHARED, run_review, summary, write_review

OURS = REFERENCE / "open_data"

# name -> (sheet, expected.json, columns that the review keeps out)
SETS = {
    "corn strip": (OURS / "corn_strip", "sheet.csv"),
    "maize npk": (OURS / "maize_npk", "sheet.csv"),
    "urban birds": (OURS / "urban_birds", "sheet.csv"),
    "rapeseed": (SHARED / "raw_rapeseed_varieties", "sheet.csv"),
    "rice": (SHARED / "raw_rice_nitrogen", "sheet.csv"),
    "salt marsh": (SHARED / "review_saltmarsh_grazing", "canonical.csv"),
    "nutrients": (SHARED / "review_nutrient_heterogeneity", "canonical.csv"),
    "urban birds, raw": (SHARED / "review_urban_birds", "canonical_raw443.csv"),
    "six trials": (SHARED / "textbook_borenstein2009", "dataset1_means.csv"),
}
PARAMETERS = 1e-5  # OPTIMUM: the reference searches stop at about 1e-8 of the criterion

ANALYSES = {
    "rows only": {"order": "first", "levels": ["row"], "shared_controls": "ignore"},
    "rows only, second order": {"levels": ["row"], "shared_controls": "ignore"},
    "study and row": {"order": "first"},
    "study and row, no covariance": {"order": "first", "shared_controls": "ignore"},
}


@pytest.fixture(scope="module")
def reviews(tmp_path_factory):
    """Review of each set, run once when first asked for."""
    done: dict[str, Path] = {}

    def get(name: str) -> Path:
        folder, sheet = SETS[name]
        if not (folder / sheet).exists():
            pytest.skip(f"{folder.name} is not beside the repository (its licence keeps it out)")
        if name not in done:
            rows = pd.read_csv(folder / sheet, dtype=str)
            done[name] = _review(tmp_path_factory.mktemp("open"), rows)
        return done[name]

    return get


def _review(root: Path, rows: pd.DataFrame, zero_sd: str = "as typed") -> Path:
    rows = rows.drop(columns="outcome", errors="ignore").rename(columns={"unit": "typed_unit"})
    config = {
        "outcomes": {"response": None},
        "analyses": {
            name.replace(",", ""): {"outcome": "response", **options}
            for name, options in ANALYSES.items()
        },
        "strategies": [
            "complete cases",
            {"missing cases": {"average_cv": "mean of squares"}},
            {"name": "missing square", "use": "missing cases"},
        ],
        "zero_sd": zero_sd,
    }
    write_review(root, rows, config)
    run_review(root)
    return root


def _row(root: Path, analysis: str, strategy: str = "complete cases") -> pd.Series:
    table = summary(root)
    name = analysis.replace(",", "")
    found = table[(table["analysis"] == name) & (table["strategy"] == strategy)]
    assert len(found) == 1
    return found.iloc[0]


def _expected(name: str, *keys: str) -> dict:
    content = json.loads((SETS[name][0] / "expected.json").read_text())
    content = content["raw443"] if name == "urban birds, raw" else content
    return next((content[key] for key in keys if key in content), {})


@pytest.mark.parametrize("name", SETS)
@pytest.mark.parametrize(
    ("analysis", "keys"),
    [
        ("rows only", ("reml_lnrr_v1", "lnrr_reml_v1")),
        ("rows only, second order", ("reml_lnrrbc_v2", "lnrrbc_reml_v2")),
    ],
)
def test_one_component_means_match_brute_force(reviews, name, analysis, keys):
    row, wanted = _row(reviews(name), analysis), _expected(name, *keys)
    assert row["rows"] == wanted["k"]
    np.testing.assert_allclose(row["estimate"], wanted["mu"], atol=PARAMETERS, rtol=0)
    np.testing.assert_allclose(row["se_model"], wanted["se"], atol=PARAMETERS, rtol=0)
    np.testing.assert_allclose(row["var_row"], wanted["tau2"], atol=PARAMETERS, rtol=PARAMETERS)


@pytest.mark.parametrize("name", [name for name in SETS if name != "six trials"])
def test_two_component_means_match_brute_force(reviews, name):
    wanted = _expected(name, "reml_multilevel_sharedV_lnrr", "reml_multilevel_study_sharedV")
    if not wanted:
        pytest.skip("no two-component reference for this set")
    row = _row(reviews(name), "study and row")
    assert (row["rows"], row["studies"]) == (wanted["k"], wanted["n_groups"])
    np.testing.assert_allclose(row["estimate"], wanted["mu"], atol=PARAMETERS, rtol=0)
    np.testing.assert_allclose(row["se_model"], wanted["se"], atol=PARAMETERS, rtol=0)
    found = [row["var_study"], row["var_row"]]
    wished = [wanted["sigma2_group"], wanted["tau2_row"]]
    np.testing.assert_allclose(found, wished, atol=PARAMETERS, rtol=1e-4)


@pytest.mark.parametrize("name", ["salt marsh", "nutrients", "urban birds"])
def test_two_component_means_without_covariance_match_brute_force(reviews, name):
    wanted = _expected(name, "reml_multilevel_study_diagV")
    row = _row(reviews(name), "study and row, no covariance")
    np.testing.assert_allclose(row["estimate"], wanted["mu"], atol=PARAMETERS, rtol=0)


@pytest.mark.parametrize("name", SETS)
def test_row_level_effects_match_an_independent_route(reviews, name):
    """Plain pandas arithmetic on the sheet, at 1e-9."""
    folder, sheet = SETS[name]
    rows = pd.read_csv(folder / sheet)
    if "row_id" not in rows:
        pytest.skip("the sheet has no row ids")
    table = pd.read_parquet(reviews(name) / "cache/analyses/rows only/effects.parquet")
    joined = table.merge(rows, on="row_id", suffixes=("", "_typed"))
    assert len(joined) == len(table) > 0
    a = (joined["treatment_sd"] / joined["treatment_mean"]) ** 2 / joined["treatment_n"]
    c = (joined["control_sd"] / joined["control_mean"]) ** 2 / joined["control_n"]
    plain = np.log(joined["treatment_mean"] / joined["control_mean"])
    own = joined["variance_first"].notna() & a.notna() & c.notna()
    assert own.any()
    np.testing.assert_allclose(joined["effect_first"], plain, rtol=1e-9, atol=1e-12)
    np.testing.assert_allclose(joined["variance_first"][own], (a + c)[own], rtol=1e-9)
    second = (a + c + (a**2 + c**2) / 2)[own]
    np.testing.assert_allclose(joined["variance_second"][own], second, rtol=1e-9)
    np.testing.assert_allclose(
        joined["effect_second"][own], (plain + (a - c) / 2)[own], rtol=1e-9, atol=1e-12
    )


@pytest.mark.parametrize("name", [name for name in SETS if name not in ("six trials",)])
def test_row_level_effects_match_the_printed_rows(reviews, name):
    """`expected_rows.csv` prints eight digits: half a unit of the last one."""
    printed = SETS[name][0] / "expected_rows.csv"
    if name == "urban birds, raw" or not printed.exists():
        pytest.skip("no printed rows for this set")
    wanted = pd.read_csv(printed)
    table = pd.read_parquet(reviews(name) / "cache/analyses/rows only/effects.parquet")
    joined = table.merge(wanted[wanted["usable"]], on="row_id")
    assert len(joined) == wanted["usable"].sum()
    for ours, theirs in (
        ("effect_first", "lnrr"),
        ("variance_first", "v1"),
        ("effect_second", "lnrr_bc"),
        ("variance_second", "v2"),
    ):
        np.testing.assert_allclose(joined[ours], joined[theirs], rtol=6e-8)


@pytest.mark.parametrize("name", SETS)
def test_ledger_balances(reviews, name):
    root = reviews(name)
    rows_in = len(pd.read_csv(root / "data/extraction/comparisons.csv"))
    ledger = pd.read_csv(root / "results/tables/ledger.csv")
    for _, row in summary(root).iterrows():
        applies = pd.Series(True, index=ledger.index)
        for column in ("analysis", "strategy", "model"):
            applies &= ledger[column].isna() | (ledger[column] == row[column])
        left = ledger[applies]
        assert not left["row_id"].duplicated().any()
        assert row["rows"] + len(left) == rows_in


def test_missing_cases_match_brute_force_without_shared_arms(tmp_path):
    """The raw bird sheet names no control ids, so every arm is unique, as in the reference fill;
    zero SDs count as missing there, which is drystone's default."""
    folder, sheet = SETS["urban birds, raw"]
    if not (folder / sheet).exists():
        pytest.skip(f"{folder.name} is not beside the repository (its licence keeps it out)")
    root = _review(tmp_path, pd.read_csv(folder / sheet, dtype=str), zero_sd="missing")
    for strategy, key in (
        ("missing cases", "reml_fill_mean_cv2"),
        ("missing square", "reml_fill_sq_mean_cv"),
    ):
        row = _row(root, "rows only, second order", strategy)
        wanted = _expected("urban birds, raw", key)
        assert row["rows"] == wanted["k"]
        np.testing.assert_allclose(row["estimate"], wanted["mu"], atol=PARAMETERS, rtol=0)


def test_six_trials_match_the_handbook(reviews):
    """Borenstein, Hedges, Higgins & Rothstein 2009, six-trial table typed from memory; the
    brute-force fit of the same table gives .08247 (no printed value for REML)."""
    row = _row(reviews("six trials"), "rows only")
    assert row["rows"] == 6
    assert round(row["estimate"], 5) == 0.08247
