"""Answers to findings: what is accepted, what is asked again after which change."""

from __future__ import annotations

import pytest
from sheet.typed_sheets import balances, found, rows, settings, table

from drystone.sheet.answers import Answers, read_answers
from drystone.sheet.intake import Intake, take_in
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawSheet

HEAD = "row,rule,decision,reason,who,date,row_digest\n"
ZERO = {"control_sd": 0.0}
RULE = "zero spread"


def intake(changes, answers: Answers) -> Intake:
    return take_in(RawSheet("x.xlsx", table(rows(*changes))), settings(), answers)


def written(tmp_path, text, bound=None) -> Answers:
    path = tmp_path / "answers.csv"
    path.write_text(HEAD + text)
    return read_answers(path, bound)


def test_without_a_file_there_are_no_answers(tmp_path):
    assert read_answers(tmp_path / "answers.csv") == Answers()


def test_accepted_finding_goes_to_a_list_of_its_own(tmp_path):
    answers = written(tmp_path, f"r2,{RULE},accept,the paper prints 0.0,RH,2024-05-01,\n")
    taken = intake(({}, ZERO, ZERO), answers)
    assert found(taken, RULE) == [("ask", "F4", "r3")]
    (accepted,) = taken.accepted.to_dict("records")
    assert (accepted["row_id"], accepted["cell"], accepted["level"]) == ("r2", "F3", "ask")
    assert (accepted["reason"], accepted["who"]) == ("the paper prints 0.0", "RH")
    # the stated default holds: the SD counts as missing, accepted or not
    assert taken.rows["control_sd_value"].isna().tolist() == [False, True, True]
    assert balances(taken)


def test_row_that_an_answer_leaves_out_stands_in_the_ledger(tmp_path):
    answers = written(tmp_path, "r1,missing mean,leave out,figure is unreadable,RH,,\n")
    taken = intake(({"control_mean": None}, {}), answers)
    assert taken.findings.empty
    assert taken.ledger[["rule", "reason"]].to_numpy().tolist() == [
        ["left out by an answer", "figure is unreadable"]
    ]
    assert balances(taken)


def test_stop_cannot_be_accepted(tmp_path):
    answers = written(tmp_path, "r1,missing mean,accept,never mind,RH,,\n")
    taken = intake(({"control_mean": None}, {}), answers)
    assert found(taken, "missing mean") == [("stop", "E2", "r1")]
    (note,) = taken.findings[taken.findings["rule"] == "answer without effect"].to_dict("records")
    assert (note["sheet"], note["cell"], note["level"]) == ("answers.csv", "A2", "warn")
    assert "level stop cannot be accepted" in note["wrong"]


@pytest.mark.parametrize(
    ("line", "words"),
    [
        (f"r9,{RULE},accept,x,,,", "no row is called 'r9'"),
        ("r2,zero spred,accept,x,,,", "has no finding 'zero spred'"),
        (f"r2,{RULE},maybe,x,,,", "'maybe' is no decision"),
        (",missing row_id,accept,x,,,", "the sheet as a whole has no finding"),
    ],
)
def test_answers_without_effect_are_said_and_change_nothing(tmp_path, line, words):
    taken = intake(({}, ZERO), written(tmp_path, line + "\n"))
    assert found(taken, RULE) == [("ask", "F3", "r2")]
    (note,) = taken.findings[taken.findings["rule"] == "answer without effect"]["wrong"]
    assert words in note


def test_finding_about_no_row_can_be_accepted_until_it_says_something_else(tmp_path):
    text = ",missing row_id,accept,we do not plan editions,RH,,\n"
    blank = {"row_id": None}
    answers = written(tmp_path, text)
    taken = intake((blank, {}), answers)
    assert list(taken.accepted["rule"]) == ["missing row_id"]
    again = written(tmp_path, text, answers.newly_bound)
    assert found(intake((blank, blank, {}), again), "missing row_id")[0][0] == "warn"


def test_the_last_line_about_a_finding_counts(tmp_path):
    lines = f"r1,{RULE},leave out,first,,,\nr1,{RULE},accept,then,,,\n"
    taken = intake((ZERO,), written(tmp_path, lines))
    assert list(taken.accepted["reason"]) == ["then"]
    assert taken.ledger.empty


def test_file_without_a_needed_column_is_refused(tmp_path):
    path = tmp_path / "answers.csv"
    path.write_text("row,decision\nr1,accept\n")
    with pytest.raises(SheetProblem, match="no column rule"):
        read_answers(path)


# What is asked again: the answered row is r2, with an SD of zero in the control arm.
CHANGES = {
    "nothing": (lambda r: r, False),
    "rows in another order": (lambda r: r[::-1], False),
    "rows added before it": (lambda r: [{**r[0], "row_id": "r0"}, *r], False),
    "19 written as text": (lambda r: _with(r, treatment_mean="5.000"), False),
    "a note": (lambda r: _with(r, note="checked again"), False),
    "a label": (lambda r: _with(r, control_label="no tillage"), False),
    "the extractor": (lambda r: _with(r, extractor="RH"), False),
    "a new moderator": (lambda r: _with(r, crop="oat"), False),
    "another row's mean": (lambda r: [{**r[0], "control_mean": 4.5}, *r[1:]], False),
    "its other SD": (lambda r: _with(r, treatment_sd=0.9), True),
    "its mean": (lambda r: _with(r, control_mean=4.01), True),
    "its n": (lambda r: _with(r, control_n=5.0), True),
    "its unit": (lambda r: _with(r, unit="kg/ha"), True),
    "its design": (lambda r: _with(r, design="block"), True),
    "its control's name": (lambda r: _with(r, control_id="plot 3"), True),
}


def _with(sheet, **change):
    return [{**row, **change} if row["row_id"] == "r2" else row for row in sheet]


@pytest.mark.parametrize("by_hand", [True, False])
@pytest.mark.parametrize("change", list(CHANGES))
def test_what_is_asked_again(tmp_path, change, by_hand):
    edit, asked_again = CHANGES[change]
    sheet = rows({}, ZERO, {})
    line = f"r2,{RULE},accept,prints 0.0,RH,2024-05-01,"
    first = written(tmp_path, line + "\n")
    take_in(RawSheet("x.xlsx", table(sheet)), settings(), first)
    (digest,) = first.newly_bound.values()
    later = (
        written(tmp_path, line + "\n", first.newly_bound)
        if by_hand
        else written(tmp_path, f"{line}{digest}\n")
    )
    taken = take_in(RawSheet("x.xlsx", table(edit(sheet))), settings(), later)
    found_again = taken.findings[taken.findings["rule"] == RULE]
    assert (len(found_again), len(taken.accepted)) == ((1, 0) if asked_again else (0, 1))
    if asked_again:
        assert "asked again" in found_again["wrong"].iloc[0]
        assert "by RH 2024-05-01" in found_again["wrong"].iloc[0]
    assert not later.newly_bound


def test_mended_row_needs_no_answer_any_more(tmp_path):
    line = f"r2,{RULE},accept,prints 0.0,RH,,"
    first = written(tmp_path, line + "\n")
    intake(({}, ZERO), first)
    mended = intake(({}, {}), written(tmp_path, line + "\n", first.newly_bound))
    assert mended.findings.empty
    assert mended.accepted.empty
