"""Every finding, at least once, with its address and what it does to the row."""

import datetime

import numpy as np
import pytest
from sheet.typed_sheets import balances, found, rows, settings, table, take

from drystone.sheet.intake import take_in
from drystone.sheet.notes import Note
from drystone.sheet.raw import Broken, RawSheet

# Columns of the plain row: A row_id, B study, C outcome, D unit, E control_mean, F control_sd,
# G control_n, H treatment_mean, I treatment_sd, J treatment_n; further ones follow as typed.


def reasons(intake):
    return dict(zip(intake.ledger["row_id"], intake.ledger["rule"], strict=True))


def test_a_plain_row_is_usable_and_silent():
    intake = take({})
    assert intake.findings.empty
    assert intake.ledger.empty
    row = intake.rows.iloc[0]
    assert (row["control_sd_value"], row["control_sd_rule"]) == (0.5, "as typed")
    assert (row["sheet"], row["sheet_row"]) == ("comparisons", 2)
    assert intake.columns["control_mean"] == ("E", "control_mean")


@pytest.mark.parametrize(
    ("change", "rule", "cell"),
    [
        ({"control_mean": "12,5"}, "unreadable cell", "E2"),
        ({"treatment_sd": "<5"}, "unreadable cell", "I2"),
        ({"control_n": "a few"}, "unreadable cell", "G2"),
        ({"control_n": datetime.date(2020, 5, 3)}, "unreadable cell", "G2"),
        ({"control_mean": Broken("#DIV/0!")}, "error value", "E2"),
        ({"control_mean": Broken("", unsaved=True)}, "error value", "E2"),
        ({"study": Broken("#REF!")}, "error value", "B2"),
        ({"control_mean": ""}, "missing mean", "E2"),
        ({"treatment_mean": "NA"}, "missing mean", "H2"),
        ({"treatment_mean": 0.0}, "zero mean", "H2"),
        ({"control_mean": -4.0}, "negative mean", "E2"),
        ({"control_n": ""}, "missing n", "G2"),
        ({"treatment_n": 0}, "n below one", "J2"),
        ({"control_sd": -0.5}, "negative spread", "F2"),
        ({"study": ""}, "missing study", "B2"),
        ({"outcome": ""}, "missing outcome", "C2"),
        ({"outcome": "yeild"}, "unknown outcome", "C2"),
        ({"control_centre_kind": "mean of logs"}, "mean of logs", "K2"),
    ],
)
def test_stops_name_the_cell_and_book_the_row(change, rule, cell):
    intake = take(change, {})
    assert found(intake, rule) == [("stop", cell, "r1")]
    assert reasons(intake) == {"r1": rule}
    assert list(intake.usable["row_id"]) == ["r2"]
    assert balances(intake)


def test_negative_means_in_both_arms_are_no_rescue():
    intake = take({"control_mean": -4.0, "treatment_mean": -2.0})
    assert found(intake, "negative mean") == [("stop", "E2", "r1"), ("stop", "H2", "r1")]
    assert "not a rescue" in intake.findings["wrong"][0]


def test_the_literal_is_shown_and_an_unreadable_mean_is_not_called_missing():
    intake = take({"control_mean": "12.3*"})
    assert list(intake.findings["value"]) == ["12.3*"]
    assert found(intake, "missing mean") == []


def test_numbers_that_decide_nothing_only_warn():
    intake = take({"icc": "0,2", "note": Broken("#N/A")})
    assert found(intake, "unreadable cell") == [("warn", "K2", "r1")]
    assert found(intake, "error value") == [("warn", "L2", "r1")]
    assert intake.ledger.empty


def test_doubled_spaces_are_taken_out_and_said():
    intake = take({"study": "Alder  2001"}, {})
    assert found(intake, "hidden spaces") == [("fixed", "B2", "r1")]
    assert set(intake.rows["study"]) == {"Alder 2001"}


def test_outcome_in_another_spelling_is_read_and_said():
    intake = take({"outcome": "Yield "})
    assert found(intake, "outcome spelling") == [("fixed", "C2", "r1")]
    assert list(intake.usable["outcome"]) == ["yield"]


def test_unknown_outcome_names_the_nearest():
    assert "did you mean 'yield'?" in take({"outcome": "yeild"}).findings["wrong"][0]


def test_outcome_without_a_ratio_scale_leaves_under_one_finding():
    outcomes = {"yield": {"scale": "ratio"}, "date of bud burst": {"scale": "interval"}}
    changes = ({"outcome": "date of bud burst", "unit": u} for u in ("day", "week"))
    intake = take({}, *changes, outcomes=outcomes)
    assert found(intake, "not a ratio scale")[0][:2] == ("stop", "C3")
    assert len(intake.findings) == 1
    assert reasons(intake) == {"r2": "not a ratio scale", "r3": "not a ratio scale"}


def test_unit_that_differs_from_the_config_stops():
    intake = take({"unit": "kg/ha"}, {}, {"unit": ""}, outcomes={"yield": {"unit": "t/ha"}})
    assert found(intake, "another unit") == [("stop", "D2", "r1")]
    assert "in the config" in intake.findings["wrong"][0]


def test_unit_that_differs_from_the_most_common_stops():
    intake = take({}, {"unit": "kg/ha"}, {})
    assert found(intake, "another unit") == [("stop", "D3", "r2")]
    assert "most common" in intake.findings["wrong"][0]


@pytest.mark.parametrize("names", [("", "", ""), ("mine", "", "")])
def test_missing_row_ids_become_temporary_ones(names):
    changes = [{"row_id": name, "treatment_label": f"dose {i}"} for i, name in enumerate(names)]
    intake = take(*changes)
    ((level, _, row_id),) = found(intake, "missing row_id")
    assert level == "warn"
    assert row_id != row_id  # about no single row
    assert intake.rows["row_id"][1] == "Alder 2001 | yield | dose 1"
    assert balances(intake)


def test_temporary_row_ids_do_not_depend_on_row_order_but_for_equal_rows():
    changes = [{"row_id": "", "date": str(i % 3)} for i in range(4)]
    first, second = take(*changes), take(*changes[::-1])
    assert set(first.rows["row_id"]) == set(second.rows["row_id"])
    assert first.rows["row_id"][3] == "Alder 2001 | yield | 0 #2"


def test_temporary_row_ids_keep_clear_of_typed_ones():
    intake = take({"row_id": "Alder 2001 | yield"}, {"row_id": ""})
    assert list(intake.rows["row_id"]) == ["Alder 2001 | yield", "Alder 2001 | yield #2"]


def test_repeated_row_id_takes_all_its_rows_out():
    intake = take({"row_id": "a"}, {"row_id": "b"}, {"row_id": "a"}, {"row_id": "a"})
    assert found(intake, "repeated row_id") == [("stop", "A4", "a"), ("stop", "A5", "a")]
    assert "A2" in intake.findings["wrong"][0]
    assert list(intake.ledger["sheet_row"]) == [2, 4, 5]
    assert list(intake.usable["row_id"]) == ["b"]
    assert balances(intake)


def test_excluded_rows_leave_with_the_teams_reason_and_without_findings():
    intake = take({"exclude_reason": "flooded plots", "control_mean": "12,5"}, {})
    assert intake.findings.empty
    assert list(intake.ledger["reason"]) == ["flooded plots"]
    assert reasons(intake) == {"r1": "excluded by the team"}


def test_pending_and_retracted_studies_leave():
    studies = [
        {"study": "Alder 2001", "status": "Retracted"},
        {"study": "Birch 2002", "status": "pending"},
        {"study": "Cedar 2003", "status": "corrected", "year": 2003.0, "citation": "C. 2003"},
    ]
    names = ("Alder 2001", "Birch 2002", "Cedar 2003")
    intake = take(*({"study": name} for name in names), studies=studies)
    assert reasons(intake) == {"r1": "study retracted", "r2": "study pending"}
    row = intake.usable.iloc[0]
    assert tuple(row[["study_status", "study_citation"]]) == ("corrected", "C. 2003")
    assert row["study_year"] == 2003.0
    assert list(intake.studies["status"]) == ["retracted", "pending", "corrected"]


def test_study_absent_from_the_studies_table_is_said_once():
    intake = take(
        {"study": "Adler 2001"}, {"study": "Adler 2001"}, studies=[{"study": "Alder 2001"}]
    )
    assert found(intake, "study not in the studies table") == [("warn", "B2", "r1")]
    assert "did you mean 'Alder 2001'" in intake.findings["wrong"][0]
    assert intake.ledger.empty


def test_studies_table_is_checked_in_its_own_sheet():
    studies = [
        {"study": "Alder 2001", "status": "inn", "year": "MMI"},
        {"study": "Alder 2001"},
        {"study": "", "year": 2002},
    ]
    intake = take({}, studies=studies)
    seen = intake.findings[["sheet", "cell", "rule"]].itertuples(index=False, name=None)
    assert sorted(seen) == [
        ("studies", "A3", "repeated study"),
        ("studies", "A4", "no study name"),
        ("studies", "B2", "unknown status"),
        ("studies", "C2", "year"),
    ]
    assert len(intake.studies) == 1


@pytest.mark.parametrize(("config", "filled"), [("study minimum", 4.0), ("outcome median", 5.0)])
def test_missing_n_can_borrow_a_stated_number(config, filled):
    # by hand: n of the study 4, 5, 5 -> minimum 4; of the outcome 4, 5, 5, 9, 9 -> median 5
    other = {"study": "Birch 2002", "control_n": 9, "treatment_n": 9}
    intake = take({}, {"control_n": ""}, other, missing_n=config)
    assert found(intake, "borrowed n") == [("fixed", "G3", "r2")]
    assert intake.rows["control_n"][1] == filled
    assert intake.ledger.empty


def test_borrowed_median_is_rounded_down():
    # by hand: 4, 5, 4, 5 and the row's own 5 -> median of 4, 4, 5, 5 (own left out) is 4.5 -> 4
    changes = ({}, {}, {"study": "B", "control_n": "", "treatment_n": ""})
    intake = take(*changes, missing_n="outcome median")
    assert intake.rows["control_n"][2] == 4.0


def test_missing_n_without_a_lender_leaves():
    intake = take({"study": "B", "control_n": "", "treatment_n": ""}, {}, missing_n="study minimum")
    assert reasons(intake) == {"r1": "missing n"}
    assert "none to lend" in intake.ledger["reason"][0]


def test_n_that_is_not_whole_is_asked_about_and_used():
    intake = take({"control_n": 4.5})
    assert found(intake, "n not whole") == [("ask", "G2", "r1")]
    assert list(intake.usable["control_n"]) == [4.5]


def test_words_outside_the_list_are_asked_about_or_blanked():
    changes = {
        "control_spread": 0.2,
        "control_spread_kind": "SX",
        "control_sd": "",
        "test_kind": "z",
    }
    intake = take(changes)
    assert found(intake, "unknown word") == [("ask", "L2", "r1"), ("warn", "M2", "r1")]
    assert np.isnan(intake.rows["control_sd_value"][0])
    assert intake.rows["test_kind"].isna().all()
    assert intake.ledger.empty


def test_words_in_another_case_are_read_and_said():
    intake = take({"control_sd": "", "control_spread": 0.2, "control_spread_kind": "se"})
    assert found(intake, "word spelling") == [("fixed", "L2", "r1")]
    assert intake.rows["control_spread_kind"][0] == "SE"


def test_designs_are_lists_of_words():
    intake = take({"design": "Block, paired"}, {"design": "block, blok"}, {})
    assert list(intake.rows["design"]) == ["block, paired", "block", "independent"]
    assert found(intake, "unknown word") == [("warn", "K3", "r2")]
    assert [level for level, *_ in found(intake, "design not used")] == ["ask", "ask"]


def test_centres_and_subsamples_are_asked_about():
    intake = take({"control_centre_kind": "median", "treatment_n_meaning": "subsample"})
    assert found(intake, "centre is no mean") == [("ask", "K2", "r1")]
    assert found(intake, "n counts subsamples") == [("ask", "L2", "r1")]
    assert intake.ledger.empty


def test_defaults_that_ask_do_so_once_for_all_rows():
    intake = take({}, {}, {}, defaults={"design": "paired"})
    assert [level for level, *_ in found(intake, "design not used")] == ["ask"]
    assert "3 rows" in intake.findings["wrong"][0]


def test_one_arm_with_two_faces_is_asked_about_with_both_cells():
    shared = {"control_id": "C", "date": "2001"}
    intake = take(shared, {**shared, "control_mean": 4.1}, {**shared, "control_sd": ""})
    assert found(intake, "arm with two faces") == [("ask", "E3", "r2")]
    wrong = intake.findings["wrong"][0]
    assert "4 in E2" in wrong
    assert "4.1 in E3" in wrong


def test_arms_of_other_dates_outcomes_and_studies_are_other_arms():
    shared = {"control_id": "C", "date": "2001"}
    others = ({"date": "2002"}, {"study": "Birch 2002"}, {"outcome": "height"})
    intake = take(
        shared,
        *({**shared, "control_mean": 9.0, **other} for other in others),
        outcomes={"yield": None, "height": None},
    )
    assert found(intake, "arm with two faces") == []


def test_an_arm_is_the_same_on_both_sides():
    first = {"treatment_id": "low", "control_id": "none"}
    second = {"treatment_id": "high", "control_id": "low", "control_mean": 5.5}
    intake = take(first, second)
    assert ("ask", "E3", "r2") in found(intake, "arm with two faces")


def test_doubtful_normality_warns():
    # lnrr.geary_fail of the formula sheet: mean 2.1, SD 1.9, n 7 -> 2.8234, below 3
    intake = take({"control_mean": 2.1, "control_sd": 1.9, "control_n": 7})
    assert found(intake, "normal approximation") == [("warn", "E2", "r1")]
    assert "2.82" in intake.findings["wrong"][0]


def test_moderator_that_is_nearly_all_numbers_warns_at_the_odd_cells():
    changes = [{"depth": str(i)} for i in range(9)] + [{"depth": "12,5"}]
    intake = take(*changes)
    assert found(intake, "number column with text") == [("warn", "K11", "r10")]
    assert intake.rows["depth"][9] == "12,5"


def test_moderators_are_typed_by_what_they_hold():
    changes = ({"depth": 5, "crop": "oat", "land": "NA"}, {"depth": "7.5", "crop": 3, "land": ""})
    intake = take(*changes)
    assert intake.moderators == ("depth", "crop", "land")
    assert list(intake.rows["depth"]) == [5.0, 7.5]
    assert list(intake.rows["crop"]) == ["oat", "3"]
    assert intake.rows["land"].isna().all()
    assert intake.findings.empty


def test_error_value_in_a_moderator_warns_and_counts_as_missing():
    intake = take({"depth": 5}, {"depth": Broken("#REF!")})
    assert found(intake, "error value") == [("warn", "K3", "r2")]
    assert np.isnan(intake.rows["depth"][1])


def test_reserved_names_are_ignored_and_said():
    intake = take({"sheet_row": 5})
    assert found(intake, "reserved name")[0][:2] == ("warn", "K1")
    assert intake.moderators == ()
    assert list(intake.rows["sheet_row"]) == [2]


def test_remarks_of_the_reader_become_findings():
    raw = RawSheet("x.xlsx", table(rows({})))
    note = Note("warn", "not UTF-8", "wrong", "todo", sheet="x.csv")
    intake = take_in(RawSheet(raw.file, raw.comparisons, None, (note,)), settings())
    assert list(intake.findings["sheet"]) == ["x.csv"]
