"""Where marks go, what a copy of .ods and CSV looks like, open copies, hostile texts, limits."""

from __future__ import annotations

import functools
import itertools
from pathlib import Path

import openpyxl
import pandas as pd
import pytest
from sheet.messy_books import SOFFICE, calculated, edit, reopened
from sheet.test_marked_copy import front_texts, hue, marked
from sheet.typed_sheets import grid, ods_parts, pack, save_xlsx, settings

from drystone.sheet.intake import take_in
from drystone.sheet.marked_copy import fresh_book, listing, marks, target
from drystone.sheet.marked_copy.look import COLOURS, as_number
from drystone.sheet.marked_copy.write import write_marked_copy
from drystone.sheet.readers import read_sheet

SHARED = Path(__file__).resolve().parents[3] / "shared" / "data"
BIRDS = SHARED / "review_urban_birds" / "raw_database.xlsx"


def finding(**fields):
    blank = dict.fromkeys(("sheet", "cell", "row_id", "column", "value"), None)
    return {"level": "warn", "rule": "odd", "wrong": "it is odd", "todo": "look", **blank, **fields}


def copy_of(path, *findings):
    """Opened copy of a sheet with the given findings instead of its own."""
    intake = take_in(read_sheet(path), settings())
    made = path.with_name("copy.xlsx")
    columns = list(intake.findings.columns)
    table = pd.DataFrame(list(findings), columns=columns).astype("str").where(lambda t: t != "None")
    write_marked_copy(path, table, intake.rows, intake.columns, made)
    return openpyxl.load_workbook(made)


@pytest.fixture
def plain(tmp_path):
    """Two empty lines and a title above the headers are no matter of ours: headers in row 1."""
    return save_xlsx(tmp_path / "plain.xlsx", {"comparisons": grid({}, {}, {}), "studies": []})


def test_whole_column_is_marked_at_its_header(plain):
    sheet = copy_of(plain, finding(sheet="comparisons", column="control_sd"))["comparisons"]
    assert hue(sheet["F1"]) == COLOURS["warn"]
    assert "it is odd" in sheet["F1"].comment.text


def test_whole_row_is_marked_at_its_name_or_its_column(plain):
    book = copy_of(
        plain,
        finding(sheet="comparisons", row_id="r2"),
        finding(sheet="comparisons", row_id="r3", column="treatment_n", level="ask"),
    )
    assert hue(book["comparisons"]["A3"]) == COLOURS["warn"]
    assert hue(book["comparisons"]["J4"]) == COLOURS["ask"]
    cells = {row[2].value for row in book["findings"].iter_rows(min_row=2)}
    assert cells == {"A3", "J4"}


def test_findings_without_a_place_are_listed_and_break_nothing(plain):
    strange = [
        finding(sheet="comparisons", cell="ZZZZ9"),
        finding(sheet="comparisons", cell="A9999999"),
        finding(sheet="comparisons", cell="XFE1"),  # one column beyond the last
        finding(sheet="no such sheet", cell="A1"),
        finding(column="no such column"),
        finding(),
    ]
    book = copy_of(plain, *strange)
    lines = list(book["findings"].iter_rows(min_row=2))
    assert len(lines) == len(strange)
    assert all(line[2].hyperlink is None for line in lines)
    assert not any(cell.comment for row in book["comparisons"].iter_rows() for cell in row)


def test_gravest_level_colours_the_cell_and_all_findings_are_said(plain):
    at = {"sheet": "comparisons", "cell": "E2"}
    book = copy_of(
        plain,
        finding(**at, level="fixed", wrong="converted"),
        finding(**at, level="stop", wrong="no number"),
    )
    cell = book["comparisons"]["E2"]
    assert hue(cell) == COLOURS["stop"]
    assert cell.comment.text.index("no number") < cell.comment.text.index("converted")


def test_cell_in_a_merged_range_is_marked_at_its_first(tmp_path):
    path = calculated(tmp_path / "c.xlsx")
    sheet = copy_of(path, finding(sheet="comparisons", cell="O2"))["comparisons"]
    assert hue(sheet["N1"]) == COLOURS["warn"]
    assert "it is odd" in sheet["N1"].comment.text


@pytest.mark.parametrize("text", ["=1+1", "+1", "-a", "@SUM(A1)", "=HYPERLINK(1)", "\x00\x0b=2"])
def test_texts_never_become_formulas(plain, text):
    fields = dict.fromkeys(("rule", "value", "wrong", "todo", "column"), text)
    book = copy_of(plain, finding(sheet="comparisons", cell="B2", **fields))
    ours = [cell for name in book.sheetnames[:2] for row in book[name] for cell in row]
    shown = [
        cell for cell in ours if isinstance(cell.value, str) and text.strip("\0\x0b") in cell.value
    ]
    assert len(shown) >= 6
    assert {cell.data_type for cell in ours} <= {"s", "n"}
    starts = [cell for cell in shown if cell.value[0] in "=+-@"]
    assert starts
    assert all(cell.quotePrefix for cell in starts)


def test_csv_values_stand_at_their_addresses(tmp_path):
    path = tmp_path / "sheet.csv"
    lines = [",".join(map(str, row)) for row in grid({"control_sd": "0.50"}, {"study": "=1+1"})]
    path.write_text("\n".join([lines[0], "", *lines[1:]]), encoding="utf-8")
    book = openpyxl.load_workbook(marked(path))
    sheet = book["sheet.csv"]
    assert sheet["A3"].value == "r1"
    assert (sheet["E3"].value, sheet["F3"].value) == ("4.0", "0.50")  # as typed
    assert (sheet["B4"].value, sheet["B4"].data_type) == ("=1+1", "s")
    assert sheet.freeze_panes == "A2"
    assert any("CSV" in text for text in front_texts(book))


@pytest.mark.parametrize(
    ("text", "number"),
    [("12", 12), ("-0.5", -0.5), ("4.0", None), ("0.50", None), ("007", None), ("1e3", None)],
)
def test_only_numbers_that_show_the_same_become_numbers(text, number):
    assert as_number(text) == number


def test_folder_of_csv_files_gives_one_sheet_for_each(tmp_path):
    folder = tmp_path / "extraction"
    folder.mkdir()
    for name, cells in (
        ("comparisons", grid({"control_n": "many"})),
        ("studies", [["study"], ["Z"]]),
    ):
        rows = [",".join(map(str, row)) for row in cells]
        (folder / f"{name}.csv").write_text("\n".join(rows), encoding="utf-8")
    intake = take_in(read_sheet(folder), settings())
    copy = tmp_path / "copy.xlsx"
    write_marked_copy(folder, intake.findings, intake.rows, intake.columns, copy)
    book = openpyxl.load_workbook(copy)
    assert book.sheetnames == ["marked copy", "findings", "comparisons.csv", "studies.csv"]
    assert hue(book["comparisons.csv"]["G2"]) == COLOURS["stop"]


def test_long_or_forbidden_names_become_sheet_names():
    made = fresh_book._empty()
    names = ["a/b?c", "x" * 40, "X" * 31, "''"]
    for name in names:
        fresh_book._add(made, name)
    assert len({title.casefold() for title in made.titles.values()}) == len(names)
    assert all(len(title) <= 31 for title in made.titles.values())


def test_ods_gets_a_new_workbook_with_the_same_addresses(tmp_path):
    path = tmp_path / "sheet.ods"
    cells = "".join(
        "<table:table-row>"
        + "".join(
            f'<table:table-cell office:value-type="float" office:value="{value}"/>'
            if isinstance(value, float)
            else f'<table:table-cell office:value-type="string"><text:p>{value}</text:p>'
            "</table:table-cell>"
            for value in row
        )
        + "</table:table-row>"
        for row in grid({}, {"control_mean": "four"})
    )
    path.write_bytes(pack(ods_parts(cells)))
    book = openpyxl.load_workbook(marked(path))
    sheet = book["comparisons"]
    assert (sheet["B2"].value, sheet["E2"].value) == ("Alder 2001", 4)
    assert hue(sheet["E3"]) == COLOURS["stop"]
    assert any("they are not copied from .ods" in text for text in front_texts(book))


@pytest.mark.skipif(SOFFICE is None, reason="LibreOffice is not installed")
def test_ods_as_libreoffice_writes_it(tmp_path):
    (tmp_path / "out").mkdir()
    path = reopened(calculated(tmp_path / "c.xlsx"), tmp_path / "out", "ods")
    sheet = openpyxl.load_workbook(marked(path))["comparisons"]
    assert [sheet[f"K{row}"].value for row in (2, 4)] == [1.25, 1.25]
    assert hue(sheet["F5"]) == COLOURS["stop"]


@pytest.mark.parametrize(
    "damage",
    [
        {"xl/styles.xml": lambda xml: xml.replace("<cellXfs", "<cellXfs odd='1'")},
        {
            "xl/workbook.xml": lambda xml: xml.replace(
                "<workbook ", "<workbook a='http://purl.oclc.org/ooxml' "
            )
        },
    ],
)
def test_workbook_that_cannot_be_kept_is_copied_as_values(tmp_path, damage):
    path = save_xlsx(tmp_path / "x.xlsx", {"comparisons": grid({"control_mean": "four"})})
    book = openpyxl.load_workbook(marked(edit(path, damage)))
    assert hue(book["comparisons"]["E2"]) == COLOURS["stop"]
    assert any("could not be opened whole" in text for text in front_texts(book))


def test_open_copy_is_left_alone_and_the_new_one_numbered(tmp_path):
    sheet = Path("my sheet.xlsx")

    def put(text):
        return target.put(lambda path: path.write_text(text), tmp_path, sheet).name

    assert put("1") == "my sheet marked.xlsx"
    (tmp_path / ".~lock.my sheet marked.xlsx#").write_text("")
    assert put("2") == "my sheet marked 2.xlsx"
    (tmp_path / "~$my sheet marked 2.xlsx").write_text("")
    assert put("3") == "my sheet marked 3.xlsx"
    assert (tmp_path / "my sheet marked.xlsx").read_text() == "1"
    assert [path.name for path in target.open_copies(tmp_path, sheet)] == [
        "my sheet marked.xlsx",
        "my sheet marked 2.xlsx",
    ]
    for lock in [path for path in tmp_path.iterdir() if target.is_lock(path)]:
        lock.unlink()
    assert put("4") == "my sheet marked.xlsx"
    assert [path.name for path in tmp_path.iterdir()] == ["my sheet marked.xlsx"]


def test_system_that_refuses_to_replace_an_open_file(tmp_path, monkeypatch):
    move = target.os.replace

    def refuse(source, place):
        if place.name == "a marked.xlsx":
            raise PermissionError(13, "in use", str(place))
        move(source, place)

    monkeypatch.setattr(target.os, "replace", refuse)
    made = target.put(lambda path: path.write_text(""), tmp_path, Path("a.csv"))
    assert made.name == "a marked 2.xlsx"


def test_failed_copy_leaves_the_old_one(tmp_path):
    target.put(lambda path: path.write_text("old"), tmp_path, Path("a.xlsx"))

    def fail(path):
        path.write_text("half")
        raise OSError(28, "No space left on device")

    with pytest.raises(OSError, match="No space"):
        target.put(fail, tmp_path, Path("a.xlsx"))
    assert [path.read_text() for path in tmp_path.iterdir()] == ["old"]


def test_limits_are_said_on_the_first_sheet(plain, monkeypatch):
    monkeypatch.setattr(marks, "MOST_NOTES", 2)
    monkeypatch.setattr(listing, "MOST_LISTED", 3)
    found = [finding(sheet="comparisons", cell=f"{c}2") for c in "ABCDE"]
    book = copy_of(plain, *found)
    sheet = book["comparisons"]
    assert [hue(sheet[f"{c}2"]) for c in "ABCDE"] == [COLOURS["warn"]] * 5
    assert [sheet[f"{c}2"].comment is not None for c in "ABCDE"] == [True] * 2 + [False] * 3
    assert book["findings"].max_row == 4
    texts = " ".join(front_texts(book))
    assert "Only the first" in texts
    assert "of 5 findings" in texts


def test_many_formulas_are_quoted_up_to_a_limit(tmp_path, monkeypatch):
    monkeypatch.setattr(marks, "MOST_QUOTED", 3)
    book = openpyxl.load_workbook(marked(calculated(tmp_path / "c.xlsx")))
    sheet = book["comparisons"]
    quoted = [row for row in range(2, 8) if sheet[f"K{row}"].comment is not None]
    assert len(quoted) < 6
    assert sheet["K7"].value == 1.25
    assert "=2*0.25" in sheet["F4"].comment.text  # it has a finding, so it is quoted all the same


def _lightness(colour: str) -> float:
    """CIE 1976 L* of an sRGB colour (IEC 61966-2-1 and CIE 15, from memory)."""
    parts = [int(colour[i : i + 2], 16) / 255 for i in (0, 2, 4)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in parts]
    y = 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]
    return 116 * y ** (1 / 3) - 16


def test_colours_differ_in_grey_and_carry_dark_letters():
    light = [_lightness(colour) for colour in COLOURS.values()]
    assert min(abs(a - b) for a, b in itertools.combinations(light, 2)) > 4
    assert min(light) > 60  # dark letters (L* 15) keep a contrast above 4.5 to 1 (WCAG 2.1)


@pytest.mark.skipif(not BIRDS.exists(), reason="the shared data are not here")
def test_real_workbook_keeps_every_value(tmp_path):
    """Every stored value of the original is in the copy, at the same address."""
    approx = functools.partial(pytest.approx, rel=1e-15, abs=0)
    path = tmp_path / BIRDS.name
    path.write_bytes(BIRDS.read_bytes())
    config = {
        "columns": {
            "study": "study_ID",
            "outcome": "trait",
            "control_mean": "rural_mean",
            "control_sd": "rural_sd",
            "control_n": "rural_n",
            "treatment_mean": "urban_mean",
            "treatment_sd": "urban_sd",
            "treatment_n": "urban_n",
        },
    }
    traits = pd.read_csv(BIRDS.with_name("raw_all_effect_sizes.csv"))["trait"].dropna().unique()
    copy = marked(path, outcomes=dict.fromkeys(traits), **config)
    before = openpyxl.load_workbook(path, data_only=True)
    after = openpyxl.load_workbook(copy)
    assert after.sheetnames[2:] == before.sheetnames
    compared = 0
    for name in before.sheetnames:
        for row in before[name].iter_rows():
            for cell in row:
                if cell.value is not None:
                    found = after[name][cell.coordinate].value
                    # openpyxl writes 16 digits of a float
                    wanted = approx(cell.value) if isinstance(cell.value, float) else cell.value
                    assert found == wanted, (name, cell.coordinate)
                    compared += 1
    assert compared > 10_000
    assert hue(after["ALL EFFECT SIZES"]["K19"]) == COLOURS["ask"]
