"""Every kind of spread from the cell of a CSV review to effect and variance of its row.

Expected SDs: tests/reference/checks.json (computed there with mpmath), or by hand beside the entry;
variances then by the definition v = SD_t^2 / (n_t m_t^2) + SD_c^2 / (n_c m_c^2).
"""

import csv
from dataclasses import dataclass, field

import numpy as np
import pytest
from reference.formula_sheet import check
from sheet.typed_sheets import settings

from drystone.sheet.intake import take_in
from drystone.sheet.readers import read_sheet
from drystone.stages.compute_effects import effects_table
from drystone.stages.intake_store import save_intake
from drystone.stages.slice_rows import run as make_slice
from drystone.tables.store import read_table
from drystone.words import spreads

STATED = 1e-10  # rel_tol that checks.json states for computed values

MEANS = {"control_mean": 10.5, "control_n": 5, "treatment_mean": 13.2, "treatment_n": 6}
FOUR = {**MEANS, "control_n": 4, "treatment_n": 4}
QUANTILES = {"n": 25, "mean": 10.2, "min": 4.1, "q1": 7.9, "q3": 12.8, "max": 19.5}


def expected(name, value):
    return float(check(name)["expect"][value])


def both(**cells):
    """The same cells for both arms."""
    return {
        f"{arm}_{name}": cell for arm in ("control", "treatment") for name, cell in cells.items()
    }


@dataclass(frozen=True)
class Case:
    """Cells of one row, and what they must become: SD of each arm, rule, changed means."""

    cells: dict
    control_sd: float
    treatment_sd: float
    rule: str
    pooled: bool = False
    means: tuple = field(default=())


def own(cells, sd, rule, **more):
    return Case(cells, sd, sd, rule, **more)


def pooled(cells, sd, rule, **more):
    return Case({**MEANS, **cells}, sd, sd, rule, pooled=True, **more)


def of_quantiles(names, mean, sd, rule, centre="median"):
    cells = both(**{k: v for k, v in QUANTILES.items() if k in (*names, "n", "mean")})
    cells |= both(centre_kind=centre)
    used = expected("median.luo_wan_shi", mean) if mean else 10.2
    sd = expected("median.luo_wan_shi", sd)
    return own(cells, sd, rule, means=(used, used))


def logs(centre, mean, **cells):
    return both(centre_kind=centre, mean=mean, n=6, **cells)


LN10 = np.log(10.0)
RAW = tuple(expected("log.log_to_raw", name) for name in ("mean_raw", "sd_raw", "mean_ln", "sd_ln"))
SD_LN = RAW[3]
# limits of a geometric mean whose logs have mean_ln and sd_ln: exp(mean_ln +- t(5) sd_ln / sqrt 6)
T_5 = expected("sd.from_ci_one_mean", "t_crit")
LIMITS = tuple(float(np.exp(RAW[2] + side * T_5 * SD_LN / np.sqrt(6))) for side in (-1, 1))

CASES = {
    "SD": own({**MEANS, **both(spread=3.1, spread_kind="SD")}, 3.1, "as typed"),
    "SE": own(
        {**MEANS, **both(spread=0.42, spread_kind="SE", n=7)},
        expected("sd.from_se", "sd"),
        "from SE",
    ),
    "CI": own(
        {**both(mean=13.2, n=6, lower=11.1, upper=15.3, spread_kind="CI")},
        expected("sd.from_ci_one_mean", "sd_t"),
        "from CI limits",
    ),
    "CI half width": own(
        {**both(mean=13.2, n=6, spread=2.1, spread_kind="CI")},
        expected("sd.from_ci_one_mean", "sd_t"),
        "from CI half width",
    ),
    "CI (z)": own(
        {**both(mean=13.2, n=6, lower=11.1, upper=15.3, spread_kind="CI (z)")},
        expected("sd.from_ci_one_mean", "sd_z"),
        "from CI limits by z",
    ),
    "CI (z) half width": own(
        {**both(mean=13.2, n=6, spread=2.1, spread_kind="CI (z)")},
        expected("sd.from_ci_one_mean", "sd_z"),
        "from CI half width by z",
    ),
    # Cochrane Handbook 6.5.2.2 (checks.json sd.from_ci.published, unrounded)
    "CI of the handbook": own(
        {**both(mean=32.1, n=25, lower=30.0, upper=34.2, spread_kind="CI")},
        float(check("sd.from_ci.published")["ours"]["sd"]),
        "from CI limits",
    ),
    # by hand: t(5) at 90 % is 2.015048 (printed tables: 2.015); sqrt(6) x 2.1 / 2.0150483733330237
    "CI at 90 %": own(
        {**both(mean=13.2, n=6, lower=11.1, upper=15.3), "confidence_percent": 90},
        np.sqrt(6) * 2.1 / 2.0150483733330237,
        "from CI limits",
    ),
    "variance": own({**MEANS, **both(spread=9.61, spread_kind="variance")}, 3.1, "from variance"),
    "CV%": own(
        {**both(mean=13.2, n=6, spread=18, spread_kind="CV%")},
        expected("sd.from_cv", "sd_group_cv"),
        "from CV%",
    ),
    "IQR": of_quantiles(("q1", "q3"), "mean_iqr", "sd_iqr", "from quartiles"),
    "IQR beside a mean": of_quantiles(("q1", "q3"), None, "sd_iqr", "from quartiles", "mean"),
    "IQR as width": own(
        {**both(mean=10.2, n=25, spread=4.9, spread_kind="IQR")},
        expected("median.luo_wan_shi", "sd_iqr"),
        "from IQR width",
    ),
    "range": of_quantiles(("min", "max"), "mean_range", "sd_range", "from range"),
    "range as width": own(
        {**both(mean=10.2, n=25, spread=15.4, spread_kind="range")},
        expected("median.luo_wan_shi", "sd_range"),
        "from range width",
    ),
    "five numbers": of_quantiles(
        ("min", "q1", "q3", "max"), "mean_five", "sd_five_shi", "from five numbers"
    ),
    "pooled SD": pooled({"pooled_spread": 2.8, "pooled_kind": "pooled SD"}, 2.8, "pooled SD"),
    "MSE": pooled({**FOUR, "pooled_spread": 0.81, "pooled_kind": "MSE"}, 0.9, "from MSE"),
    "SEM": pooled({**FOUR, "pooled_spread": 0.45, "pooled_kind": "SEM"}, 0.9, "from SEM"),
    "SED": pooled(
        {**FOUR, "pooled_spread": 0.6363961030678928, "pooled_kind": "SED"}, 0.9, "from SED"
    ),
    "LSD": pooled(
        {**FOUR, "pooled_spread": 1.35, "pooled_kind": "LSD", "error_df": 12},
        expected("sd.from_lsd", "sd"),
        "from LSD",
    ),
    # an HSD of two means is an LSD (q = sqrt(2) t), so the same SD
    "HSD": pooled(
        {
            **FOUR,
            "pooled_spread": 1.35,
            "pooled_kind": "HSD",
            "error_df": 12,
            "number_of_means": 2,
            "confidence_percent": 95,
        },
        expected("sd.from_lsd", "sd"),
        "from HSD",
    ),
    "CV% of the grand mean": pooled(
        {"pooled_spread": 18, "pooled_kind": "CV% of the grand mean", "grand_mean": 11.6},
        expected("sd.from_cv", "sd_anova_cv"),
        "from CV% of the grand mean",
    ),
    "t": pooled({"test_kind": "t", "test_value": -1.7}, expected("sd.from_t", "sp"), "from t"),
    "F": pooled(
        {"test_kind": "F", "test_value": 3.24, "number_of_means": 2},
        expected("sd.from_F", "sp"),
        "from F",
    ),
    "p": pooled({"test_kind": "p", "test_value": 0.041}, expected("sd.from_p", "sp"), "from p"),
    # Cochrane Handbook 6.5.2.3: difference 3.8, p 0.008, n 25 and 22 (unrounded chain)
    "p of the handbook": pooled(
        {
            "test_kind": "p",
            "test_value": 0.008,
            "control_mean": 10,
            "control_n": 22,
            "treatment_mean": 13.8,
            "treatment_n": 25,
        },
        4.6834693413751,
        "from p",
    ),
    "CI of the difference": pooled(
        {"difference_lower": 0.3, "difference_upper": 5.1},
        expected("sd.from_ci_diff", "sp"),
        "from CI of the difference",
    ),
    "mean of log10": own(
        logs("mean of log10", 1.08, sd=0.11), RAW[1], "from SD of logarithms", means=RAW[:1] * 2
    ),
    "mean of logs with SE": own(
        logs("mean of logs", RAW[2], spread=SD_LN / np.sqrt(6), spread_kind="SE"),
        RAW[1],
        "from SE, then from logarithms",
        means=RAW[:1] * 2,
    ),
    "mean of log10 with a pooled SD": Case(
        {**logs("mean of log10", 1.08), "pooled_spread": 0.0121, "pooled_kind": "MSE"},
        RAW[1],
        RAW[1],
        "from MSE, then from logarithms",
        pooled=True,
        means=RAW[:1] * 2,
    ),
    "geometric mean": own(
        logs("geometric mean", expected("log.log_to_raw", "geo_mean"), lower=LIMITS[0],
             upper=LIMITS[1], spread_kind="CI"),
        RAW[1],
        "from CI limits of a geometric mean, then from logarithms",
        means=RAW[:1] * 2,
    ),
}  # fmt: skip


def review(folder, cells):
    """Write a CSV review of one row; take it in and make the slice of its outcome."""
    row = {"row_id": "r1", "study": "Alder 2001", "outcome": "yield", **cells}
    with (folder / "comparisons.csv").open("w", encoding="utf-8", newline="") as stream:
        writer = csv.writer(stream)
        writer.writerow(row)
        writer.writerow([repr(float(v)) if isinstance(v, float) else v for v in row.values()])
    config = settings()
    intake = take_in(read_sheet(folder), config)
    save_intake(intake, folder / "stored")
    analysis = config.all_analyses()["yield"]
    make_slice(folder / "stored", analysis, config.outcomes, folder / "slice")
    return intake, read_table(folder / "slice" / "slice.parquet")


@pytest.mark.parametrize("name", list(CASES))
def test_from_cell_to_effect(name, tmp_path):
    case = CASES[name]
    intake, rows = review(tmp_path, case.cells)
    assert intake.ledger.empty
    (row,) = rows.to_dict("records")
    means = case.means or (case.cells["control_mean"], case.cells["treatment_mean"])
    np.testing.assert_allclose((row["control_mean"], row["treatment_mean"]), means, rtol=STATED)
    wanted = (case.control_sd, case.treatment_sd)
    np.testing.assert_allclose((row["control_sd"], row["treatment_sd"]), wanted, rtol=STATED)
    assert row["control_sd_pooled"] == row["treatment_sd_pooled"] == case.pooled
    assert set(intake.rows["control_sd_rule"]) == {case.rule}
    counts = (case.cells["control_n"], case.cells["treatment_n"])
    variance = sum((sd / mean) ** 2 / n for sd, mean, n in zip(wanted, means, counts, strict=True))
    (effect,) = effects_table(rows).to_dict("records")
    np.testing.assert_allclose(effect["variance_first"], variance, rtol=1e-9)
    np.testing.assert_allclose(effect["effect_first"], np.log(means[1] / means[0]), atol=1e-9)


@pytest.mark.parametrize("name", [name for name, case in CASES.items() if case.rule != "as typed"])
def test_every_conversion_is_derived_and_said(name, tmp_path):
    case = CASES[name]
    intake, _ = review(tmp_path, case.cells)
    derivations = intake.derivations
    assert list(derivations["arm"]) == ["control", "treatment"]
    assert set(derivations["rule"]) == {case.rule}
    np.testing.assert_allclose(derivations["sd"], case.control_sd, rtol=STATED)
    assert derivations["assumptions"].str.len().gt(10).all()
    headers = {h: i for i, h in enumerate(["row_id", "study", "outcome", *case.cells])}
    for inputs in derivations["inputs"]:
        for part in inputs.split("; "):
            left = part.split(" = ")[0].split(" ")
            if len(left) == 2:  # an address and the column that stands there
                assert left[0] == f"{_letters(headers[left[1]])}2"
    fixed = intake.findings[intake.findings["level"] == "fixed"]
    assert fixed["cell"].str.len().gt(0).all()
    assert len(fixed) >= (1 if case.pooled else 2)


def _letters(place):
    return chr(ord("A") + place)


def test_every_kind_has_a_case():
    wanted = {*spreads.SPREAD_KINDS, *spreads.POOLED_KINDS, *spreads.TEST_KINDS}
    assert wanted - set(CASES) == {spreads.UNLABELLED}  # asked about, test_sheet_spreads.py
