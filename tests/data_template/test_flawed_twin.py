"""The check against the flawed twin: what is caught, what is missed, what is alarmed in vain."""

import csv
import sys

import make_flawed_twin
import openpyxl
import pytest

from drystone.settings.load import load_settings
from drystone.sheet.intake import take_in
from drystone.sheet.present import collapse
from drystone.sheet.readers import read_sheet
from drystone.words import levels

# Codes of the catalogue that a program can see in a sheet; E34 and E35 are about the analysis.
CODES = {f"E{number}" for number in range(1, 34)}
MOST_FALSE_ALARMS = 3


@pytest.fixture(scope="module")
def folder(root):
    return root / "data_template" / "demo" / "flawed"


@pytest.fixture(scope="module")
def key(folder):
    with (folder / "answer_key.csv").open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


@pytest.fixture(scope="module")
def findings(folder):
    settings = load_settings(folder / "config.yaml")
    intake = take_in(read_sheet(folder / "extraction.xlsx"), settings)
    return intake.findings.fillna("")


@pytest.fixture(scope="module")
def clean_findings(root):
    folder = root / "data_template" / "demo"
    settings = load_settings(folder / "config.yaml")
    return take_in(read_sheet(folder / "extraction.xlsx"), settings).findings.fillna("")


def speaks(finding, answer):
    """Whether a finding is what the key asks for: rule, and row or outcome."""
    same_place = finding.row_id == answer["row_id"] and (
        answer["row_id"] or finding.value == answer["outcome"]
    )
    return finding.rule == answer["rule"] and same_place


def follows(finding, answer):
    """Whether a finding says something about a planted flaw, in the key's or in other words."""
    rules = {answer["rule"], *answer["also"].split("; ")}
    place = answer["row_id"] or answer["outcome"]
    return finding.rule in rules and place in (finding.row_id, finding.value)


def test_every_planted_flaw_is_caught_and_little_is_alarmed_in_vain(
    key, findings, clean_findings, capsys
):
    alarms = [f for f in findings.itertuples() if f.level != levels.FIXED]
    missed = [answer for answer in key if not any(speaks(f, answer) for f in alarms)]
    known = {(f.rule, f.row_id) for f in clean_findings.itertuples()}  # said of the demo too
    vain = [
        f
        for f in alarms
        if not any(follows(f, answer) for answer in key) and (f.rule, f.row_id) not in known
    ]
    told = [f"{len(key)} planted, {len(missed)} missed, {len(vain)} alarmed in vain"]
    told += [f"missed: {a['code']} {a['row_id']} {a['rule']}" for a in missed]
    told += [f"in vain: {f.rule} {f.row_id} {f.cell}: {f.wrong}" for f in vain]
    with capsys.disabled():
        sys.stdout.write("\nflawed twin: " + "\n  ".join(told) + "\n")
    assert missed == []
    assert len(vain) <= MOST_FALSE_ALARMS


def test_the_finding_points_to_the_column_of_the_key(key, findings):
    for answer in key:
        columns = {f.column for f in findings.itertuples() if speaks(f, answer)}
        assert answer["column"] in columns, answer


def test_every_code_is_planted(key):
    assert {answer["code"] for answer in key} == CODES


def test_the_first_screen_stays_short(findings):
    assert len(collapse(findings)) < 60  # every kind of finding once


def test_repository_holds_what_the_script_makes(folder, tmp_path):
    make_flawed_twin.write_flawed_twin(tmp_path)
    for name in ("answer_key.csv", "config.yaml", "README.md"):
        assert (tmp_path / name).read_text() == (folder / name).read_text()
    made, kept = (
        openpyxl.load_workbook(at / "extraction.xlsx")["comparisons"] for at in (tmp_path, folder)
    )
    assert list(made.iter_rows(values_only=True)) == list(kept.iter_rows(values_only=True))


def test_second_run_writes_the_same_bytes(tmp_path):
    for name in ("first", "second"):
        make_flawed_twin.write_flawed_twin(tmp_path / name)
    first, second = (tmp_path / name / "extraction.xlsx" for name in ("first", "second"))
    assert first.read_bytes() == second.read_bytes()


def test_everything_people_see_says_invented(folder):
    book = openpyxl.load_workbook(folder / "extraction.xlsx")
    assert "INVENTED" in book["about"]["A2"].value
    assert "INVENTED" in book.properties.description
    assert "INVENTED" in (folder / "README.md").read_text()
    assert "INVENTED" in (folder / "config.yaml").read_text()
