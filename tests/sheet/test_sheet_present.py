"""Findings as lines and as a CSV file."""

import csv

import pandas as pd
import pytest
from sheet.typed_sheets import take

from drystone.sheet.present import collapse, findings_csv, harmless
from drystone.tables.check import FINDINGS
from drystone.tables.store import empty_table


def test_findings_of_one_kind_become_one_line():
    intake = take(*({"control_n": ""} for _ in range(5)), {"control_sd": 0.0})
    first, second = collapse(intake.findings)
    assert (first.rule, first.count, first.cells) == ("missing n", 5, ("G2", "G3", "G4"))
    assert str(first).startswith(
        "stop: missing n (control_n), 5 times, comparisons G2, G3, G4, ...: the control arm has no"
    )
    assert str(second).startswith("ask: zero spread (control_sd), comparisons F7: the spread is")


def test_lines_go_from_stop_to_fixed():
    change = {"study": "A  B", "control_mean": 0.6, "treatment_n": "", "control_n": 4.5}
    lines = collapse(take(change).findings)
    assert [line.level for line in lines] == ["stop", "ask", "warn", "fixed"]


def test_no_findings_no_lines():
    assert collapse(empty_table(FINDINGS)) == []


@pytest.mark.parametrize("text", ["=1+1", "+1", "-1", "@A1", "\t=1", "\r=1"])
def test_text_that_a_spreadsheet_would_run_is_made_harmless(text):
    assert harmless(text) == f"'{text}"


def test_csv_keeps_every_finding_and_runs_nothing(tmp_path):
    intake = take({"control_mean": '=HYPERLINK("x")'}, {"control_n": "é,\n"})
    path = tmp_path / "new" / "findings.csv"
    findings_csv(intake.findings, path)
    with path.open(encoding="utf-8-sig", newline="") as stream:
        lines = list(csv.reader(stream))
    assert lines[0] == list(intake.findings.columns)
    assert lines[1][lines[0].index("value")] == '\'=HYPERLINK("x")'
    assert lines[2][lines[0].index("value")] == "é,\n"
    assert [item.name for item in path.parent.iterdir()] == ["findings.csv"]


def test_csv_is_the_same_again_and_replaces_the_old_one(tmp_path):
    path = tmp_path / "findings.csv"
    path.write_text("old")
    findings_csv(take({"control_n": ""}).findings, path)
    first = path.read_bytes()
    findings_csv(take({"control_n": ""}).findings, path)
    assert path.read_bytes() == first
    assert isinstance(pd.read_csv(path), pd.DataFrame)
