"""`drystone answer`, and what an edit of answers.csv makes rerun. The sheet is invented."""

from __future__ import annotations

import pandas as pd
import pytest
from click.testing import CliRunner
from workflow.reviews import mini_sheet, write_review

from drystone import cli
from drystone.driving.perform import perform
from drystone.driving.plan import make_plan
from drystone.driving.why import reasons
from drystone.settings.problems import ConfigProblem

CONFIG = {"outcomes": {"biomass": None}, "strategies": ["complete cases"]}
RULE = "zero spread"


@pytest.fixture
def review(tmp_path):
    sheet = mini_sheet()
    sheet.loc[0, "control_sd"] = "0"
    sheet.loc[0, "control_id"] = "an arm of its own"
    return write_review(tmp_path, sheet, CONFIG)


def command(*words):
    return CliRunner().invoke(cli.cli, [str(word) for word in words], catch_exceptions=True)


def pending(root) -> set[str]:
    return {name.split("/")[0] for name in make_plan(root).pending}


def perform_all(root) -> None:
    plan = make_plan(root)
    for name in list(plan.pending):
        perform(plan, name)


def answered(root, *, rule=RULE, decision="accept", row="r1"):
    return command("answer", root, row, rule, decision, "--reason", "prints 0.0", "--who", "RH")


def test_accepted_finding_is_shown_as_such_and_not_open(review):
    assert answered(review).exit_code == 0
    output = command("check", review).output
    assert f"accepted: {RULE} (ask): prints 0.0 (RH)" in output
    assert f"ask: {RULE}" not in output
    listed = pd.read_csv(review / "results" / "check" / "accepted.csv")
    assert list(listed["row_id"]) == ["r1"]
    line = pd.read_csv(review / "answers.csv").iloc[0]
    assert len(line["row_digest"]) == 12
    assert not (review / "cache" / "answers.json").exists()


def test_changed_row_is_asked_again(review):
    answered(review)
    path = review / "data" / "extraction" / "comparisons.csv"
    sheet = pd.read_csv(path)
    sheet.sample(frac=1, random_state=1).to_csv(path, index=False)
    assert f"accepted: {RULE}" in command("check", review).output
    sheet.loc[0, "control_mean"] *= 2
    sheet.to_csv(path, index=False)
    output = command("check", review).output
    assert f"ask: {RULE}" in output
    assert "asked again" in output


def test_line_typed_by_hand_is_bound_in_the_cache(review):
    (review / "answers.csv").write_text(f"rule;row;decision\n{RULE};r1;accept\n")
    assert f"accepted: {RULE}" in command("check", review).output
    assert (review / "cache" / "answers.json").is_file()
    path = review / "data" / "extraction" / "comparisons.csv"
    sheet = pd.read_csv(path)
    sheet.loc[0, "control_n"] += 1
    sheet.to_csv(path, index=False)
    assert "asked again" in command("check", review).output


def test_an_edit_of_the_answers_reruns_the_check_and_what_shows_it(review):
    perform_all(review)
    assert pending(review) == set()
    answered(review)
    assert pending(review) == {"check", "mark", "report", "publish"}
    told = {reason.step: reason.since for reason in reasons(make_plan(review))}
    assert told["check"] == (f"an answer about row r1 ({RULE}) holds now",)
    perform_all(review)
    assert pending(review) == set()
    (review / "answers.csv").unlink()
    assert pending(review) == {"check", "mark", "report", "publish"}


def test_a_row_that_leaves_reruns_its_analysis(review):
    perform_all(review)
    answered(review, decision="leave out")
    assert {"check", "slice", "effects", "fit"} <= pending(review)
    told = {reason.step: reason.since for reason in reasons(make_plan(review))}
    assert "left out by an answer" in told["slice/biomass"][0]


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"rule": "zero spred"}, "did you mean 'zero spread'?"),
        ({"row": "r99"}, "row 'r99' has no open finding"),
        ({"decision": "perhaps"}, "'perhaps' is no decision"),
    ],
)
def test_answer_that_cannot_hold_is_refused_and_nothing_is_written(review, change, words):
    done = answered(review, **change)
    assert isinstance(done.exception, ConfigProblem)
    assert words in str(done.exception)
    assert not (review / "answers.csv").exists()


def test_one_answer_for_every_row_with_such_a_finding(review):
    path = review / "data" / "extraction" / "comparisons.csv"
    sheet = pd.read_csv(path)
    sheet.loc[1, ["control_sd", "control_id"]] = [0.0, "another arm of its own"]
    sheet.to_csv(path, index=False)
    assert answered(review, row="*").exit_code == 0
    written = pd.read_csv(review / "answers.csv")
    assert list(written["row"]) == ["r1", "r2"]
    assert written["row_digest"].nunique() == 2


def test_columns_of_the_teams_own_stay_in_the_file(review):
    (review / "answers.csv").write_text("Row,Rule,Decision,Page\nr9,x,accept,12\n")
    answered(review)
    table = pd.read_csv(review / "answers.csv", dtype=str)
    assert list(table["Page"].fillna("")) == ["12", ""]
    assert list(table["Row"]) == ["r9", "r1"]
