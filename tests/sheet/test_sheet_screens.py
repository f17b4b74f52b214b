"""Findings that compare rows with each other: each once, with its address and level."""

import datetime

import numpy as np
import pytest
from sheet.typed_sheets import balances, found, take

# Columns of the plain row: A row_id, B study, C outcome, D unit, E control_mean, F control_sd,
# G control_n, H treatment_mean, I treatment_sd, J treatment_n; further ones follow as typed.

OTHERS = tuple(
    {
        "study": f"Birch {1990 + i}",
        "control_mean": 4.0 + 0.13 * i,
        "control_sd": 0.5 + 0.031 * i,
        "treatment_mean": 4.7 + 0.17 * (i % 5),
        "treatment_sd": 0.8 - 0.021 * i,
        "control_n": 9.0,
        "treatment_n": 9.0,
    }
    for i in range(12)
)
ARM = {"control_mean": 4.37, "control_sd": 0.51}


def alone(intake, rule):
    """The only finding of a rule."""
    (one,) = found(intake, rule)
    return one


def test_unremarkable_rows_are_silent():
    assert take(*OTHERS).findings.empty


# --- arms in several rows ---


def test_shared_control_without_ids_is_asked_once():
    intake = take(
        ARM, {**ARM, "treatment_mean": 5.5}, {**ARM, "treatment_mean": 6.5}, {"study": "B"}
    )
    assert alone(intake, "shared control") == ("ask", "E3", "r2")
    assert "separate arms" in intake.findings["wrong"][0]


@pytest.mark.parametrize("ids", [("a", "a"), ("", "")], ids=["one name for both", "another date"])
def test_shared_control_is_not_asked_where_it_is_no_question(ids):
    first = {**ARM, "control_id": ids[0], "date": "2001"}
    second = {**ARM, "control_id": ids[1], "treatment_mean": 5.5}
    second["date"] = "2001" if ids[0] else "2002"
    assert found(take(first, second), "shared control") == []


def test_coarse_numbers_without_an_sd_are_no_sign_of_a_shared_control():
    bare = {"control_mean": 12.0, "control_sd": ""}
    assert found(take(bare, {**bare, "treatment_mean": 15.0}), "shared control") == []


def test_chained_arms_by_numbers_and_by_name():
    first = {"treatment_mean": 5.37, "treatment_sd": 0.62, "treatment_n": 4.0}
    second = {"control_mean": 5.37, "control_sd": 0.62, "treatment_mean": 7.0}
    assert alone(take(first, second), "chained arms") == ("ask", "E3", "r2")
    named = take({**first, "treatment_id": "a"}, {**second, "control_id": "a"})
    assert alone(named, "chained contrasts")[0] == "fixed"
    assert found(named, "chained arms") == []


@pytest.mark.parametrize(
    ("change", "cell"),
    [
        ({**ARM, "treatment_mean": 4.37, "treatment_sd": 0.51, "treatment_n": 4.0}, "H2"),
        ({"control_id": "a", "treatment_id": "a"}, "L2"),
    ],
)
def test_control_that_is_the_treatment(change, cell):
    assert alone(take(change), "control is the treatment") == ("ask", cell, "r1")


def test_row_pasted_twice_and_what_differs():
    row = {**ARM, "treatment_mean": 5.21, "treatment_label": "north"}
    intake = take(row, {**row, "treatment_label": "south"})
    assert alone(intake, "repeated row") == ("ask", "H3", "r2")
    assert "but for treatment_label" in intake.findings["wrong"].to_list()[-1]


def test_same_trial_in_two_studies_needs_three_arms():
    rows = [{**OTHERS[i], "study": study} for study in ("A", "B") for i in (3, 4)]
    intake = take(*rows)
    assert alone(intake, "same trial in two studies") == ("ask", "B4", "r3")
    assert found(take(rows[0], rows[2]), "same trial in two studies") == []


def test_swapped_arms_by_name():
    names = {"control_id": "open", "treatment_id": "lee"}
    rows = [{**names, "treatment_id": f"lee{i}", "treatment_mean": 5.0 + i} for i in range(3)]
    turned = {"control_id": "lee9", "treatment_id": "open"}
    assert alone(take(*rows, turned), "arms swapped") == ("warn", "H5", "r4")


def test_swapped_arms_by_sign():
    rows = [{"control_mean": 4.0 + i / 10, "treatment_mean": 6.0 + i / 10} for i in range(5)]
    turned = {"control_mean": 6.3, "treatment_mean": 4.2}
    assert alone(take(*rows, turned), "arms swapped") == ("warn", "H7", "r6")
    slight = [{**row, "treatment_mean": row["control_mean"] * 1.1} for row in rows]
    assert found(take(*slight, {"treatment_mean": 3.6}), "arms swapped") == []


def test_total_beside_its_parts():
    rows = [
        {"outcome": "grass", "control_mean": 231.0, "treatment_mean": 268.0},
        {"outcome": "clover", "control_mean": 84.0, "treatment_mean": 112.0},
        {"outcome": "herbage", "control_mean": 315.0, "treatment_mean": 380.0},
    ]
    outcomes = dict.fromkeys(["grass", "clover", "herbage"])
    assert alone(take(*rows, outcomes=outcomes), "total and its parts") == ("ask", "C4", "r3")
    rows[2]["treatment_mean"] = 390.0
    assert found(take(*rows, outcomes=outcomes), "total and its parts") == []


# --- ratios and spreads ---


@pytest.mark.parametrize(
    ("factor", "rule"),
    [
        (1000.0, "ratio near a power of ten"),
        (0.1, "ratio near a power of ten"),
        (32.0, "ratio far out"),
    ],
)
def test_ratio_far_out(factor, rule):
    intake = take(*OTHERS, {"treatment_mean": 5.0 * factor, "treatment_sd": 0.75 * factor})
    assert alone(intake, rule) == ("warn", "H14", "r13")


def test_a_whole_study_far_out_is_no_slip():
    far = [{"treatment_mean": 50.0 + i, "treatment_sd": 7.0} for i in range(3)]
    rules = set(take(*OTHERS, *OTHERS, *far).findings["rule"])
    assert not rules & {"ratio near a power of ten", "ratio far out"}


def test_few_rows_are_not_judged():
    intake = take(*OTHERS[:8], {"treatment_mean": 5000.0, "treatment_sd": 750.0})
    assert found(intake, "ratio near a power of ten") == []


def standard_errors(n, **more):
    return {
        "study": "Cedar 2005",
        "control_mean": 4.4,
        "treatment_mean": 5.3,
        "control_sd": round(0.55 / n**0.5, 3),
        "treatment_sd": round(0.66 / n**0.5, 3),
        "control_n": n,
        "treatment_n": n,
        **more,
    }


def test_standard_error_in_the_sd_column_is_warned_and_not_changed():
    intake = take(*OTHERS, standard_errors(25))
    assert found(intake, "SE taken for SD") == [("warn", "F14", "r13"), ("warn", "I14", "r13")]
    wrong = intake.findings["wrong"][0]
    assert "0.55" in wrong  # the corrected SD
    assert "nothing was changed" in wrong
    assert intake.rows["control_sd_value"][12] == 0.11


def test_standard_error_of_few_replicates_cannot_be_told_from_an_sd():
    assert found(take(*OTHERS, standard_errors(3)), "SE taken for SD") == []


def test_sd_typed_as_a_standard_error():
    row = {
        **standard_errors(25, control_sd="", treatment_sd=""),
        "control_spread": 0.55,
        "treatment_spread": 0.66,
        "control_spread_kind": "SE",
        "treatment_spread_kind": "SE",
    }
    assert found(take(*OTHERS, row), "SD taken for SE")[0] == ("warn", "K14", "r13")


@pytest.mark.parametrize("sd", [0.005, 40.0])
def test_cv_far_out(sd):
    row = {"control_sd": sd, "control_n": 200, "treatment_n": 200}
    assert ("warn", "F14", "r13") in found(take(*OTHERS, row), "CV far out")


def test_sd_above_the_possible():
    over = {"unit": "%", "control_mean": 12.0, "control_sd": 37.6, "control_n": 5.0}
    outcomes = {"yield": {"scale": "ratio", "unit": "%"}}
    plain = {"unit": "%", "treatment_mean": 50.0}
    assert alone(take({**plain, **over}, outcomes=outcomes), "SD above the possible") == (
        "ask",
        "F2",
        "r1",
    )
    # 36.33 is the largest for a mean of 12 (formula sheet, sd.max_bounded), 36.98 for 12.5
    near = {**plain, **over, "control_sd": 37.0}
    assert found(take(near, outcomes=outcomes), "SD above the possible") == []
    # 4 is the largest for a mean of 2 (sd.max_nonneg), 5 for 2.5, which prints as 2 too
    free = {"control_mean": 2.0, "control_sd": 5.2, "control_n": 4.0}
    assert alone(take(free), "SD above the possible")[1] == "F2"


def test_counts_that_no_whole_numbers_give():
    counted = {"unit": "number of eggs", "control_n": 20.0, "control_n_meaning": "individual"}
    odd_mean = {**counted, "control_mean": 3.48, "control_sd": 1.2}  # grim.die
    odd_sd = {**counted, "control_mean": 3.45, "control_sd": 1.16}  # grimmer
    sound = {**counted, "control_mean": 3.45, "control_sd": 1.19}
    assert alone(take(odd_mean), "mean not of counts") == ("warn", "E2", "r1")
    assert alone(take(odd_sd), "SD not of counts") == ("warn", "F2", "r1")
    assert not set(take(sound).findings["rule"]) & {"mean not of counts", "SD not of counts"}
    assert found(take({**odd_mean, "control_n_meaning": ""}), "mean not of counts") == []


# --- what n counts ---


@pytest.mark.parametrize(
    ("typed", "used"), [("3-5", 3), ("4 or 5", 4), (">=4", 4), ("≥ 6", 6), (">3", 4), ("n=3–4", 3)]
)
def test_n_as_a_range_uses_its_lower_end(typed, used):
    intake = take({"control_n": typed})
    assert alone(intake, "n as a range") == ("ask", "G2", "r1")
    assert intake.usable["control_n"][0] == used


@pytest.mark.parametrize("typed", ["5-3", "0-4", "3-5-2020", "<5", "3-900"])
def test_what_is_no_range_of_n_stays_unreadable(typed):
    assert alone(take({"control_n": typed}), "unreadable cell")[0] == "stop"


def test_n_that_a_spreadsheet_made_of_a_date():
    assert alone(take({"control_n": 43588.0}), "n looks like a date") == ("ask", "G2", "r1")


def test_total_n_by_a_column_and_by_the_other_rows():
    both = {"control_n": 8.0, "treatment_n": 8.0}
    assert alone(take({**both, "total_n": 8.0}), "n may be the total") == ("ask", "G2", "r1")
    rows = [{"control_n": 4.0, "treatment_n": 4.0, "treatment_mean": 5.0 + i} for i in range(4)]
    assert alone(take(*rows, both), "n may be the total") == ("ask", "G6", "r5")


def test_subsamples_among_plots():
    plots = [{"control_n": 4.0, "treatment_n": 4.0, "control_mean": 4.0 + i} for i in range(3)]
    many = {"control_n": 40.0, "treatment_n": 40.0}
    assert alone(take(*plots, many), "n may count subsamples") == ("ask", "G5", "r4")
    told = {**many, "control_n_meaning": "individual", "treatment_n_meaning": "individual"}
    assert found(take(*plots, told), "n may count subsamples") == []
    assert (
        found(take(*plots, many, defaults={"n_meaning": "replicate"}), "n may count subsamples")
        == []
    )


# --- what an outcome means ---


@pytest.mark.parametrize(
    ("name", "unit", "rule"),
    [
        ("soil temperature", "", "no true zero"),
        ("warmth", "°C", "no true zero"),
        ("soil pH", "", "no true zero"),
        ("laying_date", "days", "no true zero"),
        ("NDVI", "", "no true zero"),
        ("yield anomaly", "t/ha", "no true zero"),
        ("bacteria", "log10 CFU/g", "logarithms"),
        ("height change", "cm", "change as outcome"),
        ("mass", "% of control", "change as outcome"),
        ("diversity index", "", "index as outcome"),
    ],
)
def test_outcomes_that_are_no_ratio_scale_leave_with_an_explanation(name, unit, rule):
    intake = take({"outcome": name, "unit": unit}, outcomes={name: None})
    assert found(intake, rule)[0][:2] == ("stop", "C2")
    assert list(intake.ledger["rule"]) == [rule]
    assert balances(intake)


@pytest.mark.parametrize("name", ["leaf area index", "grain yield", "phosphorus", "changeover"])
def test_sound_outcomes_stay(name):
    intake = take({"outcome": name}, outcomes={name: None})
    assert len(intake.usable) == 1
    assert intake.findings.empty


def test_a_scale_that_the_config_states_is_an_answer():
    index = {"outcome": "quality index"}
    assert take(index, outcomes={"quality index": {"scale": "ratio"}}).findings.empty
    ph = take({"outcome": "soil pH"}, outcomes={"soil pH": {"scale": "ratio"}})
    assert found(ph, "no true zero")[0][:2] == ("ask", "C2")
    assert ph.ledger.empty


def test_bounded_outcomes_and_ratios_are_warned_of():
    cover = take({"outcome": "cover", "unit": "%"}, outcomes={"cover": None})
    assert found(cover, "bounded outcome")[0][:2] == ("warn", "C2")
    beyond = {"outcome": "cover", "unit": "%", "treatment_mean": 130.0}
    assert found(take(beyond, outcomes={"cover": None}), "bounded outcome") == []
    ratio = take({"outcome": "root:shoot ratio"}, outcomes={"root:shoot ratio": None})
    assert found(ratio, "ratio of ratios")[0][:2] == ("warn", "C2")


def test_direction_is_asked_until_the_config_says_it():
    row = {"outcome": "seedling mortality"}
    intake = take(row, row, outcomes={"seedling mortality": None})
    assert [finding[:2] for finding in found(intake, "direction")] == [("ask", "C2")]
    said = take(row, outcomes={"seedling mortality": {"flip_sign": False}})
    assert found(said, "direction") == []


# --- dates, baselines, kinds, marks of typing ---


def test_several_dates_are_asked_once_for_an_outcome():
    arms = {"control_id": "a", "treatment_id": "b"}
    rows = [{**arms, "date": date, "control_mean": 4.0 + i} for i, date in enumerate("xyz")]
    assert alone(take(*rows), "several dates") == ("ask", "M3", "r2")


def test_baseline_means_are_not_used_silently():
    assert alone(take({"control_baseline_mean": 3.0}), "baseline not used") == ("ask", "K2", "r1")


def test_spread_without_a_kind_is_asked_unless_the_config_says_it():
    row = {"control_sd": "", "control_spread": 0.5}
    assert alone(take(row), "spread without a kind") == ("ask", "K2", "r1")
    assert found(take(row, defaults={"spread_kind": "SD"}), "spread without a kind") == []


def test_date_in_a_name():
    row = {"treatment_label": datetime.datetime(2020, 5, 3)}
    assert alone(take(row), "date for a name") == ("warn", "K2", "r1")
    assert found(take({"sown": datetime.date(2020, 5, 3)}), "date for a name") == []


def test_digits_that_no_figure_shows():
    row = {"control_mean": 4.03741, "control_digitised": "yes"}
    assert alone(take(row), "digits of a figure") == ("warn", "E2", "r1")
    place = {"control_mean": 4.03741, "control_source_place": "Fig. 3b"}
    assert alone(take(place), "digits of a figure")[1] == "E2"
    assert found(take({"control_mean": 4.03741}), "digits of a figure") == []


def test_rows_that_the_team_left_out_are_compared_with_nothing():
    out = {**ARM, "exclude_reason": "a copy"}
    assert take(ARM, {**out, "treatment_mean": 6.1}).findings.empty
    assert np.isfinite(take(*OTHERS, out).rows["control_mean"]).all()
