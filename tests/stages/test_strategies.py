"""Strategies on small invented slices: whose CV, which rows, what leaves."""

from __future__ import annotations

from importlib import import_module

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from drystone.settings.model import Analysis, Strategy
from drystone.stages.fill_spreads import covariance_table, sampling_table
from drystone.stages.slice_rows import settle_arms
from drystone.stages.strategies import REGISTRY
from drystone.stages.strategies.averages import average_cv
from drystone.stages.strategies.filled import NothingReported

ANALYSIS = Analysis(outcome=("cover",))


def _strategy(use: str, **options) -> Strategy:
    return Strategy(name=use, use=use, **options)


def _fill(slice_: pd.DataFrame, use: str, **options):
    return import_module(REGISTRY[use]).fill(slice_, _strategy(use, **options))


def _slice(controls, outcomes=None, seed=1) -> pd.DataFrame:
    """One row per entry of ``controls``: (control id, has SD)."""
    chance = np.random.default_rng(seed)
    count = len(controls)
    means = {name: chance.uniform(8, 12) for name, _ in controls}
    rows = pd.DataFrame(
        {
            "row_id": [f"r{number:02d}" for number in range(count)],
            "study": ["Place 1"] * count,
            "outcome": outcomes or ["cover"] * count,
            "date": [None] * count,
            "control_id": [name for name, _ in controls],
            "treatment_id": [f"t{number}" for number in range(count)],
            "control_mean": [means[name] for name, _ in controls],
            "control_sd_value": [2.0 if has else np.nan for _, has in controls],
            "control_n": [5.0] * count,
            "treatment_mean": chance.uniform(9, 15, count),
            "treatment_sd_value": [
                float(chance.uniform(1, 4)) if has else np.nan for _, has in controls
            ],
            "treatment_n": chance.integers(3, 9, count).astype(float),
            "sd_pooled": [False] * count,
        }
    )
    table = settle_arms(rows)
    table["flip"] = False
    return table


PLAIN = [(f"c{number}", number % 4 != 0) for number in range(16)]


def test_complete_cases_keep_rows_with_both_sds_and_say_what_lacked():
    filled = _fill(_slice(PLAIN), "complete cases")
    assert len(filled.rows) == 12
    assert set(filled.ledger["reason"]) == {"neither arm reports an SD"}
    assert set(filled.rows["control_cv_source"]) == {"own"}


def test_missing_cases_keep_own_cvs():
    rows = _slice(PLAIN)
    filled = _fill(rows, "missing cases")
    own = rows["control_sd"].notna()
    wanted = (rows["control_sd"] / rows["control_mean"])[own] ** 2
    np.testing.assert_allclose(filled.rows.loc[own, "control_cv2"], wanted)
    assert set(filled.rows.loc[~own, "control_cv_source"]) == {"average"}
    assert filled.rows.loc[~own, "control_cv2"].nunique() == 1
    assert filled.ledger.empty


def test_all_cases_use_one_cv_per_arm():
    filled = _fill(_slice(PLAIN), "all cases")
    assert filled.rows["control_cv2"].nunique() == filled.rows["treatment_cv2"].nunique() == 1
    assert filled.rows["control_cv2"].iloc[0] != filled.rows["treatment_cv2"].iloc[0]


def test_all_cases_over_both_arms_use_one_cv():
    filled = _fill(_slice(PLAIN), "all cases", average_over="both arms")
    assert filled.rows["control_cv2"].iloc[0] == filled.rows["treatment_cv2"].iloc[0]


def test_all_cases_on_complete_rows_borrow_the_same_average():
    """Rows and weights can be told apart: the average is that of all rows."""
    rows = _slice(PLAIN)
    every, few = _fill(rows, "all cases"), _fill(rows, "all cases", rows="complete")
    assert len(few.rows) == 12
    assert few.rows["control_cv2"].iloc[0] == every.rows["control_cv2"].iloc[0]


def test_shared_control_counts_once_in_the_average():
    """Ten rows of one control with CV .2 do not outweigh one row of another with CV .4."""
    rows = _slice([("c", True)] * 10 + [("d", True)])
    rows.loc[:9, ["control_mean", "control_sd"]] = [10.0, 2.0]
    rows.loc[10, ["control_mean", "control_sd"]] = [10.0, 4.0]
    found = average_cv(rows, _strategy("all cases")).values["cover", "control"]
    assert found == pytest.approx(0.3**2, rel=1e-12)


def test_few_reporting_arms_are_pooled_over_outcomes_and_said_so():
    outcomes = ["cover"] * 12 + ["height"] * 3
    rows = _slice([(f"c{number}", True) for number in range(15)], outcomes)
    table = average_cv(rows, _strategy("all cases")).table
    used = table[table["used"]].set_index(["outcome", "arm"])
    assert set(used.index.get_level_values(0)) == {"cover", "all outcomes"}
    assert used.loc[("all outcomes", "control"), "pooled_because"] == "only 3 arms of height report"


def test_no_reported_sd_is_said():
    with pytest.raises(NothingReported, match="no arm"):
        average_cv(_slice([("c", False), ("d", False)]), _strategy("all cases"))


def test_pooled_sds_stay_out_of_averages_by_arm():
    rows = _slice(PLAIN)
    rows.loc[1, ["control_sd_pooled", "treatment_sd_pooled"]] = True
    rows.loc[1, ["control_sd", "treatment_sd"]] = 50.0
    table = average_cv(rows, _strategy("all cases")).table
    assert table[table["used"]]["reporting_arms"].tolist() == [11, 11]


def _chain(has: tuple[bool, ...], seed: int = 3) -> pd.DataFrame:
    """Rows t1 against c, t2 against t1, t3 against t1 ...: t1 is treatment once, control often."""
    rows = _slice([("c", True)] + [("t1", has_sd) for has_sd in has], seed=seed)
    raw = rows.drop(columns=[name for name in rows if name.endswith(("_arm", "_source"))])
    raw["treatment_id"] = [f"t{number + 1}" for number in range(len(rows))]
    raw.loc[1:, "control_mean"] = raw.loc[0, "treatment_mean"]
    raw.loc[1:, "control_n"] = raw.loc[0, "treatment_n"]
    raw["control_sd_value"] = raw["control_sd"].where(raw.index == 0)
    raw["treatment_sd_value"] = raw["treatment_sd"].where(np.r_[False, np.array(has)])
    raw["sd_pooled"] = False
    keep = [name for name in raw if not name.endswith(("_sd", "_sd_pooled"))]
    return settle_arms(raw[keep]).assign(flip=False)


@pytest.mark.parametrize("use", ["missing cases", "all cases"])
def test_arm_in_both_roles_has_one_cv(use):
    """A chain: t1 heads other rows as their control. By role it would get two CVs, and V could
    become indefinite."""
    rows = _chain((True,) * 11 + (False,) * 3)
    filled = _fill(rows, use)
    first = filled.rows.loc[0, "treatment_cv2"]
    assert rows["control_arm"].iloc[1] == rows["treatment_arm"].iloc[0]
    np.testing.assert_array_equal(filled.rows.loc[1:, "control_cv2"], first)
    assert _smallest_eigenvalue(filled.rows, ANALYSIS) > 0


def _smallest_eigenvalue(rows: pd.DataFrame, analysis: Analysis) -> float:
    table = sampling_table(rows, analysis)
    place = {row: number for number, row in enumerate(table["row_id"])}
    dense = np.diag(table["sampling_variance"].to_numpy())
    for first, second, value in covariance_table(rows, analysis).itertuples(index=False):
        dense[place[first], place[second]] = dense[place[second], place[first]] = value
    return float(np.linalg.eigvalsh(dense).min())


@settings(max_examples=60, deadline=None)
@given(
    st.lists(st.tuples(st.sampled_from("abcd"), st.booleans()), min_size=2, max_size=14),
    st.sampled_from(sorted(REGISTRY)),
    st.sampled_from(["first", "second"]),
    st.integers(0, 1000),
)
def test_covariance_is_positive_definite_and_rows_balance(controls, use, order, seed):
    """Borrowing per physical arm keeps V positive definite (by row it can become indefinite)."""
    rows = _slice(controls, seed=seed)
    try:
        filled = _fill(rows, use)
    except NothingReported:
        return
    assert len(filled.rows) + len(filled.ledger) == len(rows)
    if filled.rows.empty:
        return
    analysis = Analysis(outcome=("cover",), order=order)
    assert _smallest_eigenvalue(filled.rows, analysis) > 0


def test_flipped_outcome_turns_effects_and_keeps_variances():
    rows = _slice(PLAIN)
    filled = _fill(rows, "all cases")
    plain = sampling_table(filled.rows, ANALYSIS)
    turned = sampling_table(filled.rows.assign(flip=True), ANALYSIS)
    np.testing.assert_allclose(turned["effect"], -plain["effect"])
    np.testing.assert_allclose(turned["sampling_variance"], plain["sampling_variance"])
