"""The SD of every arm: what is converted, with which derivation, and what is not."""

import numpy as np
import pytest
from sheet.typed_sheets import balances, found, take

ALGEBRA = 1e-12
PRINTED_4 = 0.5e-4

# Columns of the plain row: A row_id ... E control_mean, F control_sd, G control_n (4),
# H treatment_mean, I treatment_sd, J treatment_n; then the columns of the change, in order.


def control(change, **config):
    intake = take({"control_sd": "", **change}, **config)
    return intake, float(intake.rows["control_sd_value"][0]), intake.rows["control_sd_rule"][0]


@pytest.mark.parametrize(
    ("change", "sd", "rule"),
    [
        # by hand, with n 4 and mean 4
        ({"control_spread": 0.3, "control_spread_kind": "SE"}, 0.6, "from SE"),
        ({"control_spread": 0.25, "control_spread_kind": "variance"}, 0.5, "from variance"),
        ({"control_spread": 20.0, "control_spread_kind": "CV%"}, 0.8, "from CV%"),
        ({"control_spread": 0.3, "control_spread_kind": "SD"}, 0.3, "as typed"),
        ({"control_spread": 0.3}, 0.3, "as typed"),
    ],
)
def test_kinds_are_converted(change, sd, rule):
    intake, value, found_rule = control(change)
    np.testing.assert_allclose(value, sd, rtol=ALGEBRA)
    assert found_rule == rule
    converted = rule != "as typed"
    assert len(intake.derivations) == converted
    assert len(found(intake, f"SD {rule}")) == converted


def test_limits_are_converted():
    # sd.from_ci_one_mean of the formula sheet: 11.1 to 15.3, n 6 -> 2.00107554971941
    change = {"control_mean": 13.2, "control_n": 6, "control_lower": 11.1, "control_upper": 15.3}
    intake, value, rule = control({**change, "control_spread_kind": "CI"})
    np.testing.assert_allclose(value, 2.00107554971941, rtol=1e-10)
    assert rule == "from CI limits"
    assert found(intake, "SD from CI limits") == [("fixed", "K2", "r1")]
    (derivation,) = intake.derivations.itertuples()
    assert derivation.inputs == (
        "K2 control_lower = 11.1; L2 control_upper = 15.3; G2 control_n = 6; "
        "confidence_percent = 95 (blank)"
    )
    assert (derivation.row_id, derivation.study, derivation.arm) == ("r1", "Alder 2001", "control")


def test_limits_without_a_kind_are_an_interval_and_this_is_said():
    intake, _, rule = control({"control_lower": 3.5, "control_upper": 4.5})
    assert rule == "from CI limits"
    assert found(intake, "limits without a kind") == [("fixed", "K2", "r1")]


def test_half_width_and_level_are_used():
    # by hand: t(3) at 90 % is 2.3534 in printed tables (Student 1925 and later), so the SD is
    # sqrt(4) x 0.5 / 2.3534 = 0.42492
    change = {"control_spread": 0.5, "control_spread_kind": "CI", "confidence_percent": 90}
    _, value, rule = control(change)
    assert abs(2 * 0.5 / value - 2.3534) < PRINTED_4
    assert rule == "from CI half width"


def test_limits_go_before_a_half_width():
    limits = {"control_lower": 3.5, "control_upper": 4.5, "control_spread_kind": "CI"}
    _, alone, _ = control(limits)
    _, both, rule = control({**limits, "control_spread": 9.0})
    assert (both, rule) == (alone, "from CI limits")


@pytest.mark.parametrize(
    ("change", "word"),
    [
        ({"control_lower": 3.0, "control_upper": 5.6}, "unevenly"),
        ({"control_lower": 5.0, "control_upper": 3.0}, "not below"),
        ({"control_lower": 3.0, "control_upper": 5.0, "confidence_percent": 0.95}, "level"),
    ],
)
def test_doubtful_limits_are_asked_about_and_not_used(change, word):
    intake, value, _ = control({**change, "control_spread_kind": "CI"})
    assert np.isnan(value)
    assert found(intake, "CI not used") == [("ask", "K2", "r1")]
    assert word in intake.findings.set_index("rule")["wrong"]["CI not used"]
    assert intake.ledger.empty


def test_one_limit_is_no_interval():
    intake, value, _ = control({"control_upper": 4.5})
    assert np.isnan(value)
    assert found(intake, "one limit only") == [("ask", "K2", "r1")]


def test_sd_too_large_for_a_number_is_asked_about():
    intake, value, _ = control({"control_spread": 1.7e308, "control_spread_kind": "SE"})
    assert np.isnan(value)
    assert found(intake, "SE not used") == [("ask", "K2", "r1")]


def test_limits_that_are_uneven_by_rounding_alone_are_used():
    # by hand: 3.1 to 4.6 about 3.9 is off by 0.1 of 1.5, or 6.7 %; one digit in the last place
    # of each of the three numbers explains up to 0.2
    change = {"control_mean": 3.9, "control_lower": 3.1, "control_upper": 4.6}
    _, value, rule = control({**change, "control_spread_kind": "CI"})
    assert value > 0
    assert rule == "from CI limits"


def test_default_kind_fills_blank_kinds_only():
    changes = ({"control_spread": 0.3}, {"control_spread": 0.3, "control_spread_kind": "SD"})
    intake = take(*({"control_sd": "", **c} for c in changes), defaults={"spread_kind": "SE"})
    assert list(intake.rows["control_sd_rule"]) == ["from SE", "as typed"]


def test_unlabelled_spreads_are_asked_about_and_count_as_missing():
    intake, value, rule = control({"control_spread": 0.3, "control_spread_kind": "unlabelled"})
    assert np.isnan(value)
    assert rule != rule
    assert found(intake, "spread not converted") == [("ask", "K2", "r1")]
    # by hand: n 4, so an SE of 0.3 is an SD of 0.6
    assert "as an SE the SD would be 0.6" in intake.findings["wrong"][0]


@pytest.mark.parametrize(
    ("change", "cell", "word"),
    [
        ({"pooled_spread": 0.3, "pooled_kind": "LSD"}, "K2", "without error_df"),
        ({"pooled_spread": 0.3}, "K2", "no pooled_kind"),
        ({"test_value": 2.3}, "K2", "no test_kind"),
        ({"test_value": 2.3, "test_kind": "F"}, "K2", "without number_of_means"),
        ({"control_q1": 3.5}, "K2", "without its other end"),
        ({"control_max": 5.5}, "K2", "without its other end"),
        ({"control_q1": 3.5, "control_q3": 4.5, "control_spread_kind": "SE"}, "K2", "another kind"),
    ],
)
def test_spreads_that_lack_something_are_asked_about(change, cell, word):
    intake, value, _ = control(change)
    assert np.isnan(value)
    assert found(intake, "spread not converted") == [("ask", cell, "r1")]
    assert word in intake.findings.set_index("rule")["wrong"]["spread not converted"]
    assert intake.ledger.empty
    with_sd = take(change)
    assert found(with_sd, "spread not converted") == []


@pytest.mark.parametrize(
    ("sd", "se", "asked"),
    [(0.6, 0.3, False), (0.58, 0.3, False), (0.3, 0.3, True), (0.6557, 0.1, True)],
)
def test_typed_sd_and_typed_spread_are_compared(sd, se, asked):
    # by hand, n 4: SE 0.3 is SD 0.6, printed 0.3 may be 0.25 to 0.35, so SD 0.5 to 0.7
    change = {"control_sd": sd, "control_spread": se, "control_spread_kind": "SE"}
    intake = take(change)
    expected = [("ask", "F2", "r1")] if asked else []
    assert found(intake, "SD and spread disagree") == expected
    assert intake.rows["control_sd_value"][0] == sd
    assert intake.derivations.empty


def test_rounding_explains_a_difference():
    # Urban house wrens: SD 0.6557, SE 0.1, n 43; 0.1 may be 0.05 to 0.15, so SD 0.33 to 0.98
    change = {"control_sd": 0.6557, "control_spread": 0.1, "control_spread_kind": "SE"}
    assert found(take({**change, "control_n": 43}), "SD and spread disagree") == []


def test_sd_of_one_value_is_said_and_counts_as_missing():
    intake = take({"control_n": 1}, {"treatment_n": 1, "treatment_sd": ""})
    assert found(intake, "spread of one value") == [("warn", "F2", "r1")]
    assert np.isnan(intake.rows["control_sd_value"][0])
    assert len(intake.usable) == 2


@pytest.mark.parametrize("change", [{"control_sd": 0.0}, {"control_sd": "", "control_spread": 0.0}])
def test_zero_spread_counts_as_missing(change):
    intake = take(change)
    cell = "F2" if change["control_sd"] == 0.0 else "K2"
    assert found(intake, "zero spread") == [("ask", cell, "r1")]
    assert np.isnan(intake.rows["control_sd_value"][0])
    assert intake.ledger.empty


def test_zero_spread_is_kept_on_request_where_the_other_arm_varies():
    changes = ({"control_sd": 0.0}, {"control_sd": 0.0, "treatment_sd": 0.0})
    intake = take(*changes, zero_sd="as typed")
    assert [level for level, *_ in found(intake, "zero spread")] == ["ask", "warn", "ask"]
    assert intake.rows["control_sd_value"][0] == 0.0
    assert intake.rows["control_sd_rule"][0] == "as typed"
    assert np.isnan(intake.rows["control_sd_value"][1])


def test_missing_n_leaves_and_nothing_is_converted():
    change = {"control_spread": 0.3, "control_spread_kind": "SE", "control_n": ""}
    intake, value, _ = control(change)
    assert np.isnan(value)
    assert list(intake.ledger["rule"]) == ["missing n"]
    assert balances(intake)


def test_borrowed_n_is_said_in_the_derivation():
    change = {"control_spread": 0.3, "control_spread_kind": "SE", "control_n": ""}
    intake, value, _ = control(change, missing_n="study minimum")
    np.testing.assert_allclose(value, 0.3 * np.sqrt(5), rtol=ALGEBRA)  # the other arm's n is 5
    assert "borrowed (study minimum)" in intake.derivations["assumptions"][0]


@pytest.mark.parametrize("percent", [0.95, 5, 100, 120])
def test_impossible_levels_are_asked_about(percent):
    intake = take({"confidence_percent": percent})
    assert found(intake, "confidence level") == [("ask", "K2", "r1")]
