"""`check` of a bare sheet and `start --sheet`, as a person meets them. All sheets are invented."""

from __future__ import annotations

import csv

import pytest
from click.testing import CliRunner
from sheet.guess.messy_sheets import NUMBERS, write
from sheet.typed_sheets import save_xlsx

from drystone import cli
from drystone.driving.plan import make_plan
from drystone.sheet.problems import SheetProblem

FLAT = ["paper", "C_mean", "C_sd", "C_n", "T_mean", "T_sd", "T_n"]


def command(*words):
    return CliRunner().invoke(cli.cli, [str(word) for word in words])


def exit_of(monkeypatch, *words) -> int:
    """Exit code of the whole command line, problems included."""
    monkeypatch.setattr("sys.argv", ["drystone", *map(str, words)])
    with pytest.raises(SystemExit) as ended:
        cli.main()
    return int(ended.value.code or 0)


def test_check_of_a_sheet_prints_guesses_and_writes_findings_beside_it(tmp_path):
    path = write(tmp_path / "theirs.csv", [FLAT, *NUMBERS])
    done = command("check", path)
    assert done.exit_code == 0
    assert "mean C_mean, sd C_sd, n C_n" in done.output
    assert f"All findings with their cells: {tmp_path / 'theirs-findings.csv'}" in done.output
    with (tmp_path / "theirs-findings.csv").open(encoding="utf-8-sig") as stream:
        assert {line["rule"] for line in csv.DictReader(stream)} == {"missing row_id"}


def test_check_of_a_sheet_never_touches_it_or_another_file(tmp_path):
    path = write(tmp_path / "theirs.csv", [FLAT, *NUMBERS])
    other = tmp_path / "theirs-findings.csv"
    other.write_text("my own list of findings\n")
    before = path.read_bytes()
    command("check", path)
    command("check", path)
    assert path.read_bytes() == before
    assert other.read_text() == "my own list of findings\n"
    assert sorted(p.name for p in tmp_path.iterdir()) == [
        *("theirs-findings-2.csv", "theirs-findings.csv", "theirs.csv")
    ]


def test_findings_go_elsewhere_when_the_folder_is_read_only(tmp_path, monkeypatch):
    folder, here = tmp_path / "theirs", tmp_path / "here"
    folder.mkdir()
    here.mkdir()
    path = write(folder / "theirs.csv", [FLAT, *NUMBERS])
    folder.chmod(0o555)
    monkeypatch.chdir(here)
    done = command("check", path)
    folder.chmod(0o755)
    assert str(here / "theirs-findings.csv") in done.output
    assert (here / "theirs-findings.csv").is_file()
    assert [p.name for p in folder.iterdir()] == ["theirs.csv"]


def test_exit_codes(tmp_path, monkeypatch, capsys):
    good = write(tmp_path / "good.csv", [FLAT, *NUMBERS])
    stops = write(tmp_path / "stops.csv", [FLAT, *NUMBERS, ["Dock 1999", -1, 1, 3, 2, 1, 3]])
    wrong = write(tmp_path / "wrong.csv", [["a", "b"], [1, 2]])
    assert exit_of(monkeypatch, "check", good) == 0
    assert exit_of(monkeypatch, "check", stops) == 3
    assert exit_of(monkeypatch, "check", wrong) == 2
    assert exit_of(monkeypatch, "start", tmp_path / "new", "--sheet", wrong) == 2
    assert exit_of(monkeypatch, "check", tmp_path / "none.csv") == 2
    assert not (tmp_path / "new").exists()
    assert "Traceback" not in capsys.readouterr().err


def test_first_screen_of_a_bad_sheet_stays_under_forty_lines(tmp_path):
    lines = [
        [f"S{i}", "=x", -i, "3-5", 0, f"{i} ± 2", "NA" if i % 2 else 1.5, f"w{i}", "a  b"]
        for i in range(1, 40)
    ]
    path = write(tmp_path / "bad.csv", [[*FLAT, "treatment_label", "site"], *NUMBERS, *lines])
    shown = command("check", path).output.splitlines()
    assert len(shown) < 40


def test_start_with_a_sheet_gives_a_review_that_checks_the_same(tmp_path):
    book = {"notes": [["invented"]], "rows": [["", ""], FLAT, *NUMBERS]}
    path = save_xlsx(tmp_path / "theirs.xlsx", book)
    folder = tmp_path / "review"
    done = command("start", folder, "--sheet", path)
    assert done.exit_code == 0
    assert "no column says what was measured" in done.output
    assert (folder / "data" / "theirs.xlsx").read_bytes() == path.read_bytes()
    config = (folder / "config" / "config.yaml").read_text()
    assert '  control_mean: "C_mean"  # ' in config
    rows = make_plan(folder).state.table("rows")
    assert list(rows["control_mean"]) == [row[1] for row in NUMBERS]
    assert command("check", folder).exit_code == 0


def test_start_with_a_folder_of_csv_files(tmp_path):
    source = tmp_path / "csvs"
    source.mkdir()
    path = write(source / "rows.csv", [FLAT, *NUMBERS])
    write(source / "papers.csv", [["paper", "doi"], ["Alder 2001", "10.0/x"]])
    folder = tmp_path / "review"
    assert command("start", folder, "--sheet", source).exit_code == 0
    first = make_plan(folder).state
    assert len(first.table("rows")) == 4
    write(folder / "data" / "extraction" / path.name, [FLAT, *NUMBERS[:3]])
    again = make_plan(folder).state
    assert again.name != first.name
    assert len(again.table("rows")) == 3


def test_layout_that_the_sheet_no_longer_has_is_said(tmp_path):
    path = save_xlsx(tmp_path / "theirs.xlsx", {"rows": [FLAT, *NUMBERS], "x": [["a"]]})
    folder = tmp_path / "review"
    command("start", folder, "--sheet", path)
    save_xlsx(folder / "data" / "theirs.xlsx", {"Rows 2": [FLAT, *NUMBERS], "x": [["a"]]})
    with pytest.raises(SheetProblem, match="no sheet 'rows' with data"):
        make_plan(folder).state.ensure()
