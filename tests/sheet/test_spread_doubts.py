"""Spreads that must not become an SD silently: skew, missing cells, mixed kinds, logarithms."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import settings as trial
from hypothesis import strategies as st
from sheet.typed_sheets import balances, found, rows, settings, table, take

from drystone.sheet.findings.pooled_spreads import RESIDUAL_RULES
from drystone.sheet.intake import take_in
from drystone.sheet.raw import RawSheet
from drystone.tables.check import DERIVATIONS, FINDINGS
from drystone.tables.store import conform
from drystone.words import arms, spreads

STATED = 1e-10

# Columns of the plain row: A row_id ... E control_mean, F control_sd, G control_n (4),
# H treatment_mean, I treatment_sd, J treatment_n (5); then the columns of the change, in order.
BARE = {"control_sd": "", "treatment_sd": ""}
LSD = {"pooled_spread": 1.35, "pooled_kind": "LSD"}


def bare(change, **config):
    intake = take({**BARE, **change}, **config)
    row = intake.rows.iloc[0]
    return intake, float(row["control_sd_value"]), float(row["treatment_sd_value"])


def told(intake, rule):
    """Sentence and advice of the first finding of a rule."""
    finding = intake.findings[intake.findings["rule"] == rule].iloc[0]
    return finding["wrong"], finding["todo"]


MEDIAN = {"control_centre_kind": "median", "control_n": 25, "control_mean": 10.2}


@pytest.mark.parametrize(
    "numbers",
    [
        # by hand: quartiles |7.9 + 16 - 20.4| / 8.1 = 0.43 < 0.5225; |9.9 + 16 - 20.4| / 6.1 = 0.90
        {"control_q1": 9.9, "control_q3": 16.0},
        # range: |9 + 30 - 20.4| / 21 = 0.89 > 0.3799
        {"control_min": 9.0, "control_max": 30.0},
        # five numbers: 0.90 > 0.5974
        {"control_q1": 9.9, "control_q3": 16.0, "control_min": 9.0, "control_max": 19.5},
    ],
)
def test_skewed_arms_are_asked_about_and_count_as_missing(numbers):
    intake, sd, _ = bare({**numbers, **MEDIAN})
    kind = "IQR" if "control_q1" in numbers else "range"
    assert np.isnan(sd)
    assert found(intake, f"{kind} not used") == [("ask", "K2", "r1")]
    assert "skewed" in told(intake, f"{kind} not used")[0]
    assert [level for level, *_ in found(intake, "centre is no mean")] == ["ask"]
    assert intake.rows["control_mean"][0] == 10.2
    assert intake.ledger.empty
    assert intake.derivations.empty


def test_a_median_that_is_not_skewed_becomes_a_mean():
    intake, sd, _ = bare({"control_q1": 7.9, "control_q3": 16.0, **MEDIAN})
    assert sd > 0
    assert found(intake, "centre is no mean") == []
    # Luo et al. 2018 by hand: w = 0.7 + 0.39 / 25 = 0.7156; 0.7156 x 11.95 + 0.2844 x 10.2
    np.testing.assert_allclose(intake.rows["control_mean"][0], 11.4523, rtol=STATED)
    (derivation,) = intake.derivations.itertuples()
    assert "E2 control_mean = 10.2" in derivation.inputs  # the median as typed
    assert "in place of the median 10.2 stands the mean 11.4523" in derivation.assumptions


@pytest.mark.parametrize(
    ("numbers", "word"),
    [
        ({"control_q1": 3.5, "control_q3": 4.5}, "fewer than 5"),
        ({"control_q1": 4.5, "control_q3": 3.5, "control_n": 9}, "not below"),
        ({"control_q1": 4.2, "control_q3": 4.5, "control_n": 9}, "does not lie between"),
        ({"control_min": 5.0, "control_max": 4.5}, "not below"),
        ({"control_min": 3.5, "control_q1": 3.0, "control_q3": 5.0, "control_max": 6.0,
          "control_n": 9}, "do not rise"),
    ],
)  # fmt: skip
def test_quantiles_that_cannot_be_are_asked_about(numbers, word):
    intake, sd, _ = bare(numbers)
    assert np.isnan(sd)
    (rule,) = {rule for rule in intake.findings["rule"] if rule.endswith("not used")}
    assert word in told(intake, rule)[0]


@pytest.mark.parametrize(
    ("change", "column", "cell"),
    [
        ({**LSD, "error_df": ""}, "error_df", "M2"),
        ({**LSD, "pooled_kind": "HSD", "error_df": 12, "number_of_means": ""},
         "number_of_means", "N2"),
        ({**LSD, "pooled_kind": "HSD", "error_df": "", "number_of_means": 5}, "error_df", "M2"),
        ({"pooled_spread": 18, "pooled_kind": "CV% of the grand mean", "grand_mean": ""},
         "grand_mean", "M2"),
        ({"test_value": 4.0, "test_kind": "F", "number_of_means": ""}, "number_of_means", "M2"),
        ({"test_value": 0.03, "test_kind": "p", "error_df": "", "design": "paired"},
         "error_df", "M2"),
    ],
)  # fmt: skip
def test_missing_cells_are_named(change, column, cell):
    intake, *sds = bare(change)
    assert np.isnan(sds).all()
    assert found(intake, "spread not converted") == [("ask", "K2", "r1")]
    assert f"fill in {column}, cell {cell}" in told(intake, "spread not converted")[1]


def test_a_missing_column_is_named_too():
    intake, *_ = bare(LSD)
    assert "fill in error_df, a column to be added" in told(intake, "spread not converted")[1]


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"test_value": 0.0, "test_kind": "t"}, "zero"),
        ({"test_value": 2.0, "test_kind": "t", "control_mean": 5.0}, "equal"),
        ({"test_value": -2.0, "test_kind": "F", "number_of_means": 2}, "negative"),
        ({"test_value": 3.0, "test_kind": "F", "number_of_means": 4}, "more than two"),
        ({"test_value": 1.3, "test_kind": "p"}, "between 0 and 1"),
        ({"test_value": 0.05, "test_kind": "p"}, "only a bound"),
        ({"test_value": 0.001, "test_kind": "p"}, "only a bound"),
        ({**LSD, "error_df": 0}, "below one"),
        ({**LSD, "error_df": 12, "confidence_percent": 5}, "unusable"),
        ({**LSD, "pooled_spread": -1.35, "error_df": 12}, "negative"),
        ({**LSD, "pooled_kind": "HSD", "error_df": 12, "number_of_means": 2.5}, "whole number"),
        ({**LSD, "pooled_kind": "CV% of the grand mean", "grand_mean": -3}, "above zero"),
        ({"difference_lower": 2.0, "difference_upper": 1.0}, "not below"),
        ({"pooled_spread": 1e308, "pooled_kind": "SEM"}, "no SD above zero"),
        ({"pooled_spread": 0.0, "pooled_kind": "MSE"}, "no SD above zero"),
    ],
)
def test_numbers_that_cannot_be_are_asked_about(change, word):
    intake, *sds = bare(change)
    assert np.isnan(sds).all()
    assert found(intake, "spread not converted") == [("ask", "K2", "r1")]
    assert word in told(intake, "spread not converted")[0]
    assert intake.ledger.empty


@pytest.mark.parametrize("typed", ["<0.05", "< 0.05", "≤0.001"])
def test_inexact_p_is_asked_about(typed):
    intake, *sds = bare({"test_value": typed, "test_kind": "p"})
    assert np.isnan(sds).all()
    assert found(intake, "unreadable cell") == [("ask", "K2", "r1")]
    assert "bound" in told(intake, "unreadable cell")[0]


def test_degrees_of_freedom_of_a_test_are_used_when_typed():
    # by hand: t(5) at p 0.05 is 2.570582 (checks.json sd.from_ci_one_mean), so for p near it
    change = {"test_value": 0.0500001, "test_kind": "p", "error_df": 5, "design": "paired"}
    intake, sd, _ = bare({**change, "control_n": 6, "treatment_n": 6})
    np.testing.assert_allclose(sd, 1.0 / 2.57058183563632 / np.sqrt(2 / 6), rtol=1e-5)
    assert "no correlation of the arms" in intake.derivations["assumptions"][0]


def test_pooled_and_own_sds_that_agree_are_not_mentioned():
    # SD 0.8762516 from this LSD (checks.json sd.from_lsd); 0.9 is 2.7 % above
    same = {"control_sd": 0.9, "treatment_sd": 0.9, "control_n": 4, "treatment_n": 4}
    intake, *sds = bare({**LSD, "error_df": 12, **same})
    assert sds == [0.9, 0.9]
    assert not intake.rows["sd_pooled"][0]
    assert intake.findings.empty


def test_own_sds_win_and_a_disagreement_is_asked_about():
    intake, *sds = bare({**LSD, "error_df": 12, "control_sd": 0.9, "treatment_sd": 1.5})
    assert sds == [0.9, 1.5]
    assert not intake.rows["sd_pooled"][0]
    assert found(intake, "own and pooled SDs disagree") == [("ask", "K2", "r1")]
    assert intake.derivations.empty


@pytest.mark.parametrize(
    ("sd", "rule", "level"),
    [(0.9, "own and pooled SD in one row", "warn"), (1.5, "own and pooled SDs disagree", "ask")],
)
def test_a_row_with_one_own_sd_is_never_mixed_silently(sd, rule, level):
    change = {**LSD, "error_df": 12, "control_sd": sd, "treatment_n": 4}
    intake, *sds = bare(change)
    np.testing.assert_allclose(sds, (sd, 0.876251637225429), rtol=STATED)
    assert intake.rows["sd_pooled"][0]
    assert found(intake, rule) == [(level, "K2", "r1")]
    assert list(intake.derivations["arm"]) == ["treatment"]


def test_a_zero_sd_is_asked_about_and_the_pooled_one_stands_in():
    intake, *sds = bare({**LSD, "error_df": 12, "control_sd": 0.0, "treatment_n": 4})
    np.testing.assert_allclose(sds, 0.876251637225429, rtol=STATED)
    assert found(intake, "zero spread") == [("ask", "F2", "r1")]


def test_two_pooled_spreads_that_disagree_are_asked_about():
    intake, sd, _ = bare({**LSD, "error_df": 12, "treatment_n": 4, "test_kind": "t",
                          "test_value": 3.0})  # fmt: skip
    np.testing.assert_allclose(sd, 0.876251637225429, rtol=STATED)
    assert found(intake, "pooled spreads disagree") == [("ask", "O2", "r1")]


@pytest.mark.parametrize("design", ["block", "split plot", "paired", "block, repeated"])
def test_a_residual_sd_gets_no_arm_correlation_again(design):
    change = {**LSD, "error_df": 12, "design": design, "arm_correlation": 0.5}
    intake, *_ = bare(change)
    assert found(intake, "correlation already inside") == [("warn", "O2", "r1")]
    assert np.isnan(intake.rows["arm_correlation"][0])
    assert intake.derivations["assumptions"].str.contains("no correlation of the arms").all()
    assert intake.rows["control_sd_rule"][0] in RESIDUAL_RULES


@pytest.mark.parametrize(
    "change",
    [
        {**LSD, "error_df": 12, "design": "independent", "arm_correlation": 0.5},
        {"pooled_spread": 2.0, "pooled_kind": "pooled SD", "design": "block",
         "arm_correlation": 0.5},
        {"control_sd": 0.5, "treatment_sd": 0.6, "design": "block", "arm_correlation": 0.5},
    ],
)  # fmt: skip
def test_other_sds_keep_their_correlation(change):
    intake, *_ = bare(change)
    assert found(intake, "correlation already inside") == []
    assert intake.rows["arm_correlation"][0] == 0.5


LOGS = {"control_centre_kind": "mean of logs", "treatment_centre_kind": "mean of logs"}


def test_logs_without_both_sds_leave_a_ratio_of_geometric_means():
    change = {**LOGS, "control_mean": -0.2, "treatment_mean": 0.3, "control_spread": 0.1,
              "control_spread_kind": "SE"}  # fmt: skip
    intake, *sds = bare(change)
    assert np.isnan(sds).all()
    means = intake.rows[["control_mean", "treatment_mean"]].iloc[0]
    np.testing.assert_allclose(means.astype(float), np.exp([-0.2, 0.3]), rtol=STATED)
    assert found(intake, "centre is no mean") == [("ask", "E2", "r1"), ("ask", "H2", "r1")]
    assert intake.derivations.empty
    assert found(intake, "SD from SE") == []  # taken back: it is not used
    assert len(intake.usable) == 1


@pytest.mark.parametrize("other", ["mean", "median"])
def test_logs_in_one_arm_only_stop_the_row(other):
    kinds = {"control_centre_kind": "mean of log10", "treatment_centre_kind": other}
    intake, *_ = bare({**kinds, "control_sd": 0.1, "treatment_sd": 0.3})
    assert found(intake, "mean of logs") == [("stop", "K2", "r1")]
    assert balances(intake)


def test_antilogarithms_beyond_any_number_stop_the_row():
    intake, *_ = bare({**LOGS, "control_mean": 800.0})
    assert found(intake, "mean of logs") == [("stop", "E2", "r1")]


@pytest.mark.parametrize("spread", [{"control_sd": 0.4}, {"control_spread": 0.4}])
def test_an_sd_beside_a_geometric_mean_is_not_used(spread):
    kinds = {"control_centre_kind": "geometric mean", "treatment_centre_kind": "geometric mean"}
    intake, *sds = bare({**kinds, **spread})
    assert np.isnan(sds).all()
    assert [level for level, *_ in found(intake, "spread of a geometric mean")] == ["ask"]
    assert len(found(intake, "centre is no mean")) == 2
    assert intake.rows["control_mean"][0] == 4.0


def test_limits_that_are_uneven_even_on_the_log_scale_are_not_used():
    kinds = {"control_centre_kind": "geometric mean", "control_lower": 3.9, "control_upper": 8.0}
    intake, sd, _ = bare(kinds)
    assert np.isnan(sd)
    assert "even on the log scale" in told(intake, "CI not used")[0]


def test_a_pooled_spread_beside_geometric_means_is_not_used():
    intake, *sds = bare({"pooled_spread": 0.3, "pooled_kind": "SED",
                         "control_centre_kind": "geometric mean"})  # fmt: skip
    assert np.isnan(sds).all()
    assert found(intake, "spread not converted") == [("ask", "K2", "r1")]


numbers = st.sampled_from(["", 0.0, 0.03, 0.5, 1.0, 2.0, 3.5, 4.0, 4.5, 9.0, 30.0, -1.0, 1e300])
kinds = {
    **{f"{arm}_spread_kind": ("", *spreads.SPREAD_KINDS) for arm in arms.ARMS},
    **{f"{arm}_centre_kind": ("", *spreads.CENTRE_KINDS) for arm in arms.ARMS},
    "pooled_kind": ("", *spreads.POOLED_KINDS),
    "test_kind": ("", *spreads.TEST_KINDS),
    "design": ("", *spreads.DESIGNS),
}
spread_columns = [
    *(f"{arm}_{name}" for arm in arms.ARMS
      for name in ("mean", "n", "sd", "spread", "lower", "upper", "q1", "q3", "min", "max")),
    *("pooled_spread", "difference_lower", "difference_upper", "grand_mean", "number_of_means"),
    *("error_df", "confidence_percent", "test_value", "arm_correlation"),
]  # fmt: skip
crowded = st.fixed_dictionaries(
    {name: st.sampled_from(words) for name, words in kinds.items()},
    optional=dict.fromkeys(spread_columns, numbers),
)


@trial(max_examples=100, deadline=None)
@given(st.lists(crowded, min_size=1, max_size=4), st.sampled_from(["missing", "as typed"]))
def test_any_crowd_of_spreads_gives_a_number_or_a_gap(changes, zero_sd):
    raw = RawSheet("x.xlsx", table(rows(*({**BARE, **change} for change in changes))))
    intake = take_in(raw, settings(zero_sd=zero_sd))
    assert balances(intake)
    conform(intake.findings, FINDINGS)
    conform(intake.derivations, DERIVATIONS)
    for arm in arms.ARMS:
        usable = intake.usable
        sds, rules = usable[f"{arm}_sd_value"], usable[f"{arm}_sd_rule"]
        assert (sds.isna() | (np.isfinite(sds) & (sds >= 0))).all()
        assert (sds.isna() == rules.isna()).all()
        assert (np.isfinite(usable[f"{arm}_mean"]) & (usable[f"{arm}_mean"] > 0)).all()
        derived = intake.derivations[intake.derivations["arm"] == arm].set_index("row_id")["sd"]
        assert derived.index.is_unique
        by_row = intake.rows.set_index("row_id")
        for row_id, sd in derived.items():
            assert by_row.loc[row_id, f"{arm}_sd_value"] == sd
        told_of = by_row[f"{arm}_sd_rule"].dropna()
        computed = told_of[(told_of != "as typed")].index
        assert set(computed) == set(derived.index)
