"""Reported spreads through the whole workflow: the twelve-row sheet with its SDs in other forms."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from reference.formula_sheet import check
from workflow.reviews import mini_sheet as typed_sheet
from workflow.reviews import run_review, summary, write_review

from drystone.maths import spread_recovery as recover

CONFIG = {"outcomes": {"biomass": {"scale": "ratio"}}}
LSD, ERROR_DF = 1.5, 12


def mini_sheet() -> pd.DataFrame:
    """The twelve rows with their numbers as numbers."""
    rows = typed_sheet()
    for arm in ("control", "treatment"):
        for what in ("mean", "sd", "n"):
            rows[f"{arm}_{what}"] = pd.to_numeric(rows[f"{arm}_{what}"])
    return rows


def _in_other_forms(rows: pd.DataFrame) -> pd.DataFrame:
    """Controls as limits of a 90 % interval, treatments as SEs; blanks stay blank."""
    changed = rows.drop(columns=["control_sd", "treatment_sd"])
    n, mean = rows["control_n"].to_numpy(float), rows["control_mean"]
    half = rows["control_sd"] * recover.t_quantile(n, 90.0) / np.sqrt(n)
    changed["control_lower"], changed["control_upper"] = mean - half, mean + half
    changed["confidence_percent"] = 90
    changed["treatment_spread"] = rows["treatment_sd"] / np.sqrt(rows["treatment_n"])
    changed["treatment_spread_kind"] = "SE"
    return changed


@pytest.fixture(scope="module")
def other_forms(tmp_path_factory):
    root = tmp_path_factory.mktemp("forms")
    config = {"analyses": {"first": {"outcome": "biomass", "order": "first"}}, **CONFIG}
    write_review(root, _in_other_forms(mini_sheet()), {**config, "strategies": ["complete cases"],
                                                       "primary": "complete cases"})  # fmt: skip
    run_review(root)
    return root


@pytest.fixture(scope="module")
def with_lsd(tmp_path_factory):
    root = tmp_path_factory.mktemp("lsd")
    rows = mini_sheet().drop(columns=["control_sd", "treatment_sd"])
    rows["pooled_spread"], rows["pooled_kind"], rows["error_df"] = LSD, "LSD", ERROR_DF
    write_review(root, rows, CONFIG)
    run_review(root)
    return root


def test_se_and_limits_give_the_fit_of_the_formula_sheet(other_forms):
    expected = check("fit.complete_case")["expect"]
    table = summary(other_forms)
    (row,) = table[table["strategy"] == "complete cases"].to_dict("records")
    found = [row["estimate"], row["se_model"], row["var_study"], row["var_row"]]
    wanted = [float(v) for v in (expected["mu"], expected["se"], *expected["theta"])]
    np.testing.assert_allclose(found, wanted, rtol=1e-9)  # LINEAR_SOLVE; the engine polishes


def test_derivations_of_every_sd_are_published(other_forms):
    sheet = mini_sheet()
    table = pd.read_csv(other_forms / "results" / "tables" / "derivations.csv")
    counts = table.groupby(["arm", "rule"]).size().to_dict()
    assert counts == {
        ("control", "from CI limits"): sheet["control_sd"].notna().sum(),
        ("treatment", "from SE"): sheet["treatment_sd"].notna().sum(),
    }
    page = (other_forms / "results" / "report.html").read_text(encoding="utf-8")
    assert "from CI limits" in page


def test_an_lsd_reaches_effects_averages_and_report(with_lsd):
    """SD of each row by hand from the definition of the LSD; averages over both arms, as pooled."""
    rows = mini_sheet().set_index("row_id")
    t = float(check("sd.from_lsd")["expect"]["t"])  # 12 degrees of freedom, 5 %
    sd = LSD / t / np.sqrt(1 / rows["control_n"] + 1 / rows["treatment_n"])
    variance = sum((sd / rows[f"{a}_mean"]) ** 2 / rows[f"{a}_n"] for a in ("control", "treatment"))
    (folder,) = (with_lsd / "cache" / "analyses").iterdir()
    effects = pd.read_parquet(folder / "effects.parquet").set_index("row_id")
    found = effects.loc[rows.index, "variance_first"]
    np.testing.assert_allclose(found, variance, rtol=1e-10)
    averages = pd.read_parquet(folder / "all cases" / "averages.parquet")
    assert set(averages["arm"]) == {"both"}
    page = (with_lsd / "results" / "report.html").read_text(encoding="utf-8")
    assert "one for both arms" in page
    assert "from LSD" in page
