"""Bad input of every kind: no traceback, the right exit code, the place named, nothing lost."""

from __future__ import annotations

import sys
import zipfile
from pathlib import Path

import openpyxl
import pytest
from workflow.reviews import mini_sheet, write_config, write_review

from drystone.cli import main

OUTCOMES = {"biomass": {"unit": "g"}}


def _call(monkeypatch, capsys, *words: str) -> tuple[int, str]:
    monkeypatch.setattr(sys, "argv", ["drystone", *words])
    with pytest.raises(SystemExit) as ended:
        main()
    said = capsys.readouterr()
    assert "Traceback" not in said.err + said.out
    return int(ended.value.code or 0), said.err + said.out


@pytest.fixture
def review(tmp_path) -> Path:
    root = tmp_path / "review"
    root.mkdir()
    return write_review(root, mini_sheet(), {"outcomes": OUTCOMES})


def _config(text: str):
    return lambda root: (root / "config/config.yaml").write_text(text, encoding="utf-8")


def _settings(**more):
    base = {"sheet": "data/extraction", "outcomes": OUTCOMES}
    return lambda root: write_config(root, {**base, **more})


def _workbook(root: Path, change) -> None:
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "comparisons"
    rows = mini_sheet().astype(object)
    rows = rows.where(rows.notna(), None)
    sheet.append(list(rows.columns))
    for row in rows.itertuples(index=False):
        sheet.append([_number(value) for value in row])
    change(book, sheet)
    book.save(root / "data/book.xlsx")
    _settings(sheet="data/book.xlsx")(root)


def _number(value):
    try:
        return float(value)
    except (TypeError, ValueError):
        return value


def _csv(old: str, new: str):
    def change(root: Path) -> None:
        path = root / "data/extraction/comparisons.csv"
        text = path.read_text()
        assert old in text
        path.write_text(text.replace(old, new, 1))

    return change


def _bytes(content: bytes, name: str = "data/extraction/comparisons.csv"):
    return lambda root: (root / name).write_bytes(content)


CONFIG_FAULTS = {
    "no config": (lambda r: (r / "config/config.yaml").unlink(), "config.yaml: does not exist"),
    "empty config": (_config(""), "must hold keys"),
    "tab in yaml": (_config("sheet:\n\t- a"), "line 2"),
    "code in yaml": (
        _config("sheet: !!python/object/apply:os.system [id]"),
        "line 1: uses the tag",
    ),
    "template code in yaml": (
        _config("__definitions__: [import os]\nsheet: a\noutcomes: {a: }"),
        "__definitions__: unknown key",
    ),
    "key twice": (_config("sheet: a\nsheet: b"), "lines 1 and 2"),
    "unknown key": (_settings(strategys=["all cases"]), "did you mean 'strategies'?"),
    "unknown strategy": (_settings(strategies=["impute"]), "strategies: item 1: use"),
    "sheet absent": (_settings(sheet="data/none.xlsx"), "'none.xlsx' does not exist"),
    "sheet of another kind": (
        lambda r: (_bytes(b"x", "data/x.docx")(r), _settings(sheet="data/x.docx")(r)),
        "'x.docx' is not a sheet that can be read",
    ),
    "unknown outcome": (_settings(analyses={"a": {"outcome": "mass"}}), "did you mean 'biomass'?"),
    "code in formula": (
        _settings(analyses={"a": {"outcome": "biomass", "models": {"m": "~ open('x')"}}}),
        "open() is not allowed",
    ),
    "unknown column in formula": (
        _settings(analyses={"a": {"outcome": "biomass", "models": {"m": "~ yaer"}}}),
        "did you mean 'year'?",
    ),
    "name with a slash": (_settings(analyses={"a/b": {"outcome": "biomass"}}), "folder's name"),
    "mapped column absent": (_settings(columns={"control_mean": "ctl_mean"}), "ctl_mean"),
}

SHEET_FAULTS = {
    "empty csv": (_bytes(b""), "comparisons.csv"),
    "binary csv": (_bytes(b"\x00\x01\x02" * 50), "comparisons.csv"),
    "header only twice": (_csv("control_sd,control_n", "control_n,control_n"), "control_n"),
    "required column gone": (_csv("treatment_mean", "tmean"), "treatment_mean"),
    "workbook is no workbook": (
        lambda r: (_bytes(b"not a zip", "data/x.xlsx")(r), _settings(sheet="data/x.xlsx")(r)),
        "x.xlsx",
    ),
    "no comparisons sheet": (
        lambda r: _workbook(r, lambda book, sheet: sheet.delete_rows(1, 99)),
        "book.xlsx",
    ),
    "value in the far corner": (
        lambda r: _workbook(r, lambda book, sheet: sheet.cell(1048576, 16384, 1)),
        "XFD1048576",
    ),
}


@pytest.mark.parametrize("command", ["run", "check", "why"])
@pytest.mark.parametrize("name", [*CONFIG_FAULTS, *SHEET_FAULTS])
def test_fault_is_a_sentence_with_its_place(review, monkeypatch, capsys, name, command):
    fault, place = {**CONFIG_FAULTS, **SHEET_FAULTS}[name]
    fault(review)
    code, said = _call(monkeypatch, capsys, command, str(review))
    assert code == 2, said
    assert place in said
    assert not (review / "results").exists()


ROW_FAULTS = {
    "text for a number": (_csv("13.2", "13;2"), "13;2"),
    "zero mean": (_csv(",10.5,", ",0,"), "zero"),
    "negative mean": (_csv(",10.5,", ",-10.5,"), "-10.5"),
    "unknown outcome": (_csv("biomass", "bulk"), "bulk"),
    "row id twice": (_csv("r2,", "r1,"), "r1"),
}


@pytest.mark.parametrize("name", ROW_FAULTS)
def test_row_fault_is_a_finding_and_the_check_ends_with_3(review, monkeypatch, capsys, name):
    fault, shown = ROW_FAULTS[name]
    fault(review)
    code, said = _call(monkeypatch, capsys, "check", str(review))
    assert code == 3
    assert "comparisons.csv" in said
    findings = (review / "results/check/findings.csv").read_text()
    assert shown in findings


def test_error_cell_and_formula_without_value_are_stops(review, monkeypatch, capsys):
    def change(book, sheet):
        sheet["H2"] = "#DIV/0!"
        sheet["H2"].data_type = "e"
        sheet["H4"] = "=A1+1"

    _workbook(review, change)
    code, said = _call(monkeypatch, capsys, "check", str(review))
    assert code == 3
    assert "H2" in said
    assert "H4" in said


def test_zip_bomb_is_refused(review, monkeypatch, capsys):
    with zipfile.ZipFile(review / "data/bomb.xlsx", "w", zipfile.ZIP_DEFLATED) as bomb:
        bomb.writestr("[Content_Types].xml", "<Types/>")
        with bomb.open("xl/worksheets/sheet1.xml", "w", force_zip64=True) as part:
            for _ in range(400):
                part.write(b"0" * 1_000_000)
    _settings(sheet="data/bomb.xlsx")(review)
    code, said = _call(monkeypatch, capsys, "check", str(review))
    assert code == 2
    assert "bomb.xlsx" in said


def test_start_into_a_full_folder_writes_nothing(review, monkeypatch, capsys):
    before = sorted(review.rglob("*"))
    code, said = _call(monkeypatch, capsys, "start", str(review))
    assert code == 2
    assert "not empty" in said
    assert sorted(review.rglob("*")) == before


def test_unknown_command_and_folder(tmp_path, monkeypatch, capsys):
    assert _call(monkeypatch, capsys, "runn")[0] == 2
    code, said = _call(monkeypatch, capsys, "run", str(tmp_path / "nowhere"))
    assert code == 2
    assert "there is no such folder" in said


def test_filter_that_no_row_answers_to_is_said(review, monkeypatch, capsys):
    analyses = {"a": {"outcome": "biomass", "where": {"study": ["S1", "S9"], "year": 2004}}}
    _settings(analyses=analyses)(review)
    code, said = _call(monkeypatch, capsys, "check", str(review))
    assert code == 0
    assert "analysis 'a', where: no row has study 'S9'; known here: 'S1', " in said
    assert "2004" not in said
