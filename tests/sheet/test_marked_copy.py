"""Marked copies of messy workbooks, opened again: what was kept, what was listed as lost."""

from __future__ import annotations

import hashlib
import zipfile

import openpyxl
import pytest
from openpyxl.cell.rich_text import CellRichText
from sheet.messy_books import SOFFICE, calculated, drawn, reopened, tangled
from sheet.typed_sheets import grid, save_xlsx, settings

from drystone.sheet.intake import take_in
from drystone.sheet.marked_copy.look import COLOURS
from drystone.sheet.marked_copy.marks import LONGEST_NOTE, SIGN
from drystone.sheet.marked_copy.write import write_marked_copy
from drystone.sheet.readers import read_sheet

needs_office = pytest.mark.skipif(SOFFICE is None, reason="LibreOffice is not installed")
MESSY = {"calculated": calculated, "drawn": drawn, "tangled": tangled}


def marked(path, **config):
    """Path of the marked copy; the original must not change by a byte."""
    before = hashlib.sha256(path.read_bytes()).hexdigest()
    intake = take_in(read_sheet(path, config.get("columns")), settings(**config))
    target = path.with_name("copy.xlsx")
    write_marked_copy(path, intake.findings, intake.rows, intake.columns, target)
    assert hashlib.sha256(path.read_bytes()).hexdigest() == before
    return target


def front_texts(book):
    return [str(c.value) for row in book.worksheets[0] for c in row if c.value is not None]


def hue(cell):
    return cell.fill.fgColor.rgb[2:] if cell.fill.fill_type else None


@pytest.fixture(scope="module")
def books(tmp_path_factory):
    """The three copies, opened again."""
    made = {}
    for name, make in MESSY.items():
        ending = "xlsm" if name == "tangled" else "xlsx"
        path = make(tmp_path_factory.mktemp(name) / f"{name}.{ending}")
        made[name] = openpyxl.load_workbook(marked(path), rich_text=True)
    return made


def test_values_of_formulas_stay_and_formulas_are_quoted(books):
    sheet = books["calculated"]["comparisons"]
    assert [sheet[f"K{row}"].value for row in range(2, 8)] == [1.25] * 6
    assert "formula: =H4/E4" in sheet["K4"].comment.text
    assert sheet["M3"].value == "ab"
    assert books["calculated"]["codes"]["A1"].value == 2
    assert any("11 formulas" in text for text in front_texts(books["calculated"]))


def test_error_value_stays_marked(books):
    cell = books["calculated"]["comparisons"]["F3"]
    assert (cell.value, cell.data_type, hue(cell)) == ("#DIV/0!", "e", COLOURS["stop"])
    assert "=H3/0" in cell.comment.text


def test_formula_without_value_stays_a_formula_and_marked(books):
    cell = books["calculated"]["comparisons"]["F4"]
    assert (cell.value, hue(cell)) == ("=2*0.25", COLOURS["stop"])
    assert "No value was ever stored" in cell.comment.text


def test_own_comment_stands_before_ours(books):
    comment = books["calculated"]["comparisons"]["E6"].comment
    own, ours = comment.text.split(SIGN)
    assert own.strip() == "read from the graph"
    assert "stop, unreadable cell" in ours
    assert comment.author == "Robin"


def test_formats_widths_panes_filters_rules_and_merged_cells_stay(books):
    sheet = books["calculated"]["comparisons"]
    assert sheet["E2"].number_format == "0.000"
    assert (sheet["L2"].number_format, sheet["L2"].value.isoformat()[:10]) == (
        "dd.mm.yyyy",
        "2020-02-29",
    )
    assert sheet.column_dimensions["B"].width == 33
    assert sheet.column_dimensions["D"].hidden
    assert sheet.row_dimensions[5].hidden
    assert sheet.freeze_panes == "C2"
    assert sheet.auto_filter.ref == "A1:M7"
    assert [str(merged) for merged in sheet.merged_cells.ranges] == ["N1:P2"]
    assert [str(pick.sqref) for pick in sheet.data_validations.dataValidation] == ["C2:C100"]
    assert [str(rule.sqref) for rule in sheet.conditional_formatting] == ["H2:H7"]
    assert hue(sheet["A1"]) == "203040"
    assert books["calculated"].defined_names["arms"].value == "comparisons!$E$2:$J$7"
    assert books["calculated"]["codes"]["A3"].hyperlink.target == "https://example.org/"
    assert books["calculated"]["codes"]["A2"].value == "'=not a formula"


def test_first_sheet_says_that_nothing_was_lost_when_so(books):
    assert "Nothing was found that it could not keep." in front_texts(books["calculated"])
    assert any("hidden" in text for text in front_texts(books["calculated"]))


@pytest.mark.parametrize(
    ("name", "what"),
    [
        ("drawn", "charts"),
        ("drawn", "images"),
        ("drawn", "shapes and text boxes"),
        ("drawn", "sparklines"),
        ("drawn", "conditional formats of a newer kind"),
        ("drawn", "threads of comments"),
        ("drawn", "slicers"),
        ("drawn", "settings of the printer"),
        ("drawn", "sheets that are one chart"),
        ("drawn", "the part xl/newThings/thing1.xml"),
        ("tangled", "macros"),
        ("tangled", "links to other workbooks"),
        ("tangled", "names that point to another workbook"),
        ("tangled", "embedded files"),
        ("tangled", "pivot tables"),
    ],
)
def test_first_sheet_lists_what_was_lost(books, name, what):
    texts = front_texts(books[name])
    assert what in texts
    assert "Nothing was found that it could not keep." not in texts


def test_counts_of_lost_things(books):
    sheet = books["drawn"].worksheets[0]
    counts = {sheet.cell(row, 1).value: sheet.cell(row, 2).value for row in range(1, 30)}
    assert (counts["charts"], counts["sparklines"]) == (2, 2)
    assert counts["shapes and text boxes"] is None  # one needs no count


def test_lost_parts_are_not_in_the_copy(tmp_path):
    copy = marked(tangled(tmp_path / "t.xlsm"))
    with zipfile.ZipFile(copy) as archive:
        names = " ".join(archive.namelist()).lower()
        types = archive.read("[Content_Types].xml").decode()
    assert not any(word in names for word in ("vba", "external", "embed", "pivot", "drawing1.xml"))
    assert "macroEnabled" not in types


def test_rich_text_and_thread_are_kept_as_text(books):
    sheet = books["drawn"]["comparisons"]
    assert isinstance(sheet["B4"].value, CellRichText)
    assert str(sheet["B4"].value) == "Alder et al. 2001"
    own = sheet["J2"].comment
    assert own.text.split(SIGN)[0].strip() == "which n?"
    assert not own.author.startswith("tc=")


def test_table_protection_and_shared_formulas(books):
    sheet = books["tangled"]["comparisons"]
    assert sheet.tables["rows"].ref == "A1:K5"
    assert sheet.protection.sheet
    assert [sheet[f"K{row}"].value for row in range(2, 6)] == [8] * 4
    assert "formula: =E5*2" in sheet["K5"].comment.text


def test_own_sheet_names_are_left_to_the_team(books):
    assert books["tangled"].sheetnames[:2] == ["marked copy 2", "findings 2"]
    assert books["tangled"]["Findings"]["A1"].value == "ours already"
    assert books["tangled"]["marked copy"].sheet_state == "hidden"


@pytest.mark.parametrize("name", list(MESSY))
def test_only_the_first_sheet_is_selected(books, name):
    book = books[name]
    assert book.active.title == book.sheetnames[0]
    assert [s.title for s in book.worksheets if s.sheet_view.tabSelected] == [book.sheetnames[0]]


@pytest.mark.parametrize("name", list(MESSY))
def test_list_of_findings_leads_to_coloured_cells(books, name):
    book = books[name]
    listing = book.worksheets[1]
    lines = [row for row in listing.iter_rows(min_row=2) if row[0].value]
    assert lines
    assert sum(cell.value is not None for _, _, cell, *_ in lines) >= 2
    for level, sheet, cell, *_ in lines:
        if cell.value is None:  # macros: a finding about the whole workbook
            continue
        assert cell.hyperlink.location == f"'{sheet.value}'!{cell.value}"
        assert hue(book[sheet.value][cell.value]) is not None
        assert hue(level) == COLOURS[level.value]
    ranks = [list(COLOURS).index(level.value) for level, *_ in lines]
    assert ranks == sorted(ranks)


def test_light_letters_are_darkened_on_a_mark(tmp_path):
    path = calculated(tmp_path / "c.xlsx")
    book = openpyxl.load_workbook(path)
    book["comparisons"]["L1"] = "study_year"  # a name that drystone uses: a finding at the header
    book.save(path)
    sheet = openpyxl.load_workbook(marked(path))["comparisons"]
    assert hue(sheet["L1"]) == COLOURS["warn"]
    sheet_font = sheet["L1"].font.color
    assert sheet_font is None or sheet_font.rgb != "FFFFFFFF"


def test_marking_a_marked_copy_does_not_repeat_its_comments(tmp_path):
    first = marked(calculated(tmp_path / "c.xlsx"))
    again = first.rename(tmp_path / "went on.xlsx")
    text = openpyxl.load_workbook(marked(again))["comparisons"]["E6"].comment.text
    assert text.count(SIGN) == 1
    assert text.count("unreadable cell") == 1


def test_long_comments_are_cut_with_a_count(tmp_path):
    path = save_xlsx(tmp_path / "x.xlsx", {"comparisons": grid({"control_mean": "x"})})
    intake = take_in(read_sheet(path), settings())
    many = intake.findings.head(1).loc[[0] * 40]
    many["wrong"] = [f"{i} " + "much " * 60 for i in range(40)]
    write_marked_copy(path, many, intake.rows, intake.columns, tmp_path / "copy.xlsx")
    text = openpyxl.load_workbook(tmp_path / "copy.xlsx")["comparisons"]["E2"].comment.text
    assert len(text) < LONGEST_NOTE + 100 < 2_001
    kept = text.count("unreadable cell")
    assert text.endswith(f"and {40 - kept} more; see the list of findings")


@needs_office
@pytest.mark.parametrize("name", list(MESSY))
def test_libreoffice_opens_the_copy(tmp_path, name):
    ending = "xlsm" if name == "tangled" else "xlsx"
    copy = marked(MESSY[name](tmp_path / f"{name}.{ending}"))
    book = openpyxl.load_workbook(copy)
    text = reopened(copy, tmp_path, "fods").read_text("utf-8")
    notes = sum(c.comment is not None for s in book for row in s.iter_rows() for c in row)
    assert text.count("<office:annotation ") == notes > 0
    assert [f'table:name="{title}"' in text for title in book.sheetnames] == [True] * len(
        book.sheetnames
    )
    if name == "calculated":
        assert text.count('office:value="1.25"') == 6
        assert 'office:value="0.5"' in text  # the formula that had no value is calculated now


@needs_office
def test_values_that_libreoffice_calculated_are_kept(tmp_path):
    """The same workbook, calculated and stored by a real spreadsheet program."""
    path = calculated(tmp_path / "c.xlsx")
    book = openpyxl.load_workbook(path)
    book["comparisons"]["F3"] = 0.5
    book.save(path)  # stored values are lost here, so that all that follows was calculated
    (tmp_path / "out").mkdir()
    saved = reopened(path, tmp_path / "out", "xlsx")
    sheet = openpyxl.load_workbook(marked(saved))["comparisons"]
    assert [sheet[f"K{row}"].value for row in (2, 3, 4, 5, 7)] == [1.25] * 5  # 5 / 4
    assert sheet["K6"].value == "#VALUE!"  # 5 / "four"
    assert sheet["F4"].value == 0.5
