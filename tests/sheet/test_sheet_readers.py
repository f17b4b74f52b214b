"""Workbooks and CSV folders as tables: names, addresses, which sheet, what is refused."""

import zipfile

import pytest
from sheet.typed_sheets import (
    PLAIN,
    grid,
    ods_parts,
    pack,
    save_xlsx,
    settings,
    sheet_xml,
    xlsx_parts,
)

from drystone.sheet.intake import take_in
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken
from drystone.sheet.readers import read_sheet

LINE = "S,1,2"
HEAD = "study,control_mean,treatment_mean"


def csv_file(tmp_path, text, name="sheet.csv", encoding="utf-8"):
    path = tmp_path / name
    path.write_bytes(text.encode(encoding) if isinstance(text, str) else text)
    return path


def refusal(path, **more):
    with pytest.raises(SheetProblem) as refused:
        read_sheet(path, **more)
    return str(refused.value)


def test_xlsx_keeps_types_and_addresses(tmp_path):
    path = save_xlsx(tmp_path / "a.xlsx", {"comparisons": grid({}, {"control_mean": None})})
    raw = read_sheet(path)
    table = raw.comparisons
    place = table.headers.index("control_mean")
    assert table.columns[place] == [4.0, ""]
    assert table.address(place, 1) == "E3"
    assert table.header_address(place) == "E1"
    assert (raw.file, table.name, raw.studies) == ("a.xlsx", "comparisons", None)


def test_addresses_do_not_shift_with_empty_rows_and_columns(tmp_path):
    cells = [[], [], [None, "study", "control_mean"], [], [None, "S", 7.0]]
    table = read_sheet(save_xlsx(tmp_path / "a.xlsx", {"any": cells})).comparisons
    assert (table.header_row, table.row_numbers) == (3, (5,))
    assert table.address(1, 0) == "C5"


def test_rows_without_a_named_value_are_skipped(tmp_path):
    path = csv_file(tmp_path, f"{HEAD}\n,,\n{LINE}\n , ,\n\n{LINE}\n")
    assert read_sheet(path).comparisons.row_numbers == (3, 6)


def test_the_sheet_named_comparisons_is_taken(tmp_path):
    book = {"first": grid({}), "Comparisons": grid({}, {}), "Studies": [["study"], ["A"]]}
    raw = read_sheet(save_xlsx(tmp_path / "a.xlsx", book))
    assert raw.comparisons.name == "Comparisons"
    assert raw.studies.name == "Studies"


def test_else_the_only_sheet_with_data_is_taken(tmp_path):
    book = {"blank": [], "mine": grid({}), "studies": [["study"], ["A"]]}
    assert read_sheet(save_xlsx(tmp_path / "a.xlsx", book)).comparisons.name == "mine"


def test_else_the_sheet_with_the_mapped_columns_is_taken(tmp_path):
    mine = [["paper", "ctl", "trt"], ["S", 1, 2]]
    path = save_xlsx(tmp_path / "a.xlsx", {"notes": [["a"], ["b"]], "mine": mine})
    columns = {"study": "paper", "control_mean": "ctl", "treatment_mean": "trt"}
    assert read_sheet(path, columns).comparisons.name == "mine"
    assert "'notes', 'mine'" in refusal(path)


def test_workbook_without_data_is_refused(tmp_path):
    assert "no sheet with data" in refusal(save_xlsx(tmp_path / "a.xlsx", {"a": []}))


def test_unnamed_columns_with_values_give_one_remark(tmp_path):
    path = csv_file(tmp_path, f"{HEAD},,\n{LINE},x,\n{LINE},,\n{LINE},,y,z\n")
    (remark,) = read_sheet(path).remarks
    assert (remark.rule, remark.cell, remark.value) == ("unnamed column", "D2", "x")
    assert "D, E, F" in remark.wrong


def test_ods_reads_like_xlsx(tmp_path):
    text = '<table:table-cell office:value-type="string"><text:p>{}</text:p></table:table-cell>'
    number = '<table:table-cell office:value-type="float" office:value="{0}"><text:p>{0}</text:p></table:table-cell>'  # noqa: E501
    row = "<table:table-row>{}</table:table-row>"
    skip = '<table:table-row table:number-rows-repeated="2"><table:table-cell table:number-columns-repeated="9"/></table:table-row>'  # noqa: E501
    cells = skip + row.format("".join(map(text.format, HEAD.split(","))))
    cells += row.format(text.format("S") + number.format(1.5) + number.format(2))
    cells += skip.replace('"2"', '"1048000"')
    path = tmp_path / "a.ods"
    path.write_bytes(pack(ods_parts(cells)))
    table = read_sheet(path).comparisons
    assert table.headers == tuple(HEAD.split(","))
    assert [column[0] for column in table.columns] == ["S", 1.5, 2.0]
    assert table.address(1, 0) == "B4"


def test_broken_cells_replace_the_blanks_that_the_reader_sees(tmp_path):
    cells = (
        '<row r="1"><c r="A1" t="inlineStr"><is><t>study</t></is></c>'
        '<c r="B1" t="inlineStr"><is><t>control_mean</t></is></c></row>'
        '<row r="2"><c r="A2"><f>1+1</f></c><c r="B2" t="e"><v>#DIV/0!</v></c></row>'
        '<row r="5"><c r="A5" t="str"><f>"a"</f><v>a</v></c><c r="B5"><f>1</f><v/></c></row>'
    )
    path = tmp_path / "a.xlsx"
    path.write_bytes(pack(xlsx_parts(sheet_xml(cells))))
    table = read_sheet(path).comparisons
    assert table.columns[0] == [Broken("", unsaved=True), "a"]
    assert table.columns[1] == [Broken("#DIV/0!"), Broken("", unsaved=True)]
    assert table.row_numbers == (2, 5)


def test_macros_are_said_and_not_run(tmp_path):
    path = save_xlsx(tmp_path / "a.xlsx", {"comparisons": grid({})})
    with zipfile.ZipFile(path, "a") as archive:
        archive.writestr("xl/vbaProject.bin", b"anything")
    path = path.rename(tmp_path / "a.xlsm")
    assert [remark.rule for remark in read_sheet(path).remarks] == ["macros"]


@pytest.mark.parametrize("text", [f"{HEAD}\n{LINE}", "\ufeff" + f"{HEAD}\r\n{LINE}\r\n"])
def test_csv_with_and_without_byte_order_mark(tmp_path, text):
    table = read_sheet(csv_file(tmp_path, text)).comparisons
    assert table.headers[0] == "study"
    assert table.name == "sheet.csv"
    assert [column[0] for column in table.columns] == ["S", "1", "2"]


def test_csv_with_semicolons_and_quoted_commas(tmp_path):
    path = csv_file(tmp_path, 'study;"control_mean";treatment_mean\n"a;b";1;2\n')
    assert read_sheet(path).comparisons.columns[0] == ["a;b"]


def test_csv_addresses_count_records_not_lines(tmp_path):
    path = csv_file(tmp_path, f'{HEAD}\n"S\ntwo lines",1,2\n{LINE}\n')
    assert read_sheet(path).comparisons.row_numbers == (2, 3)


def test_csv_in_the_western_code_page_is_read_and_said(tmp_path):
    raw = read_sheet(csv_file(tmp_path, f"{HEAD}\nMüller,1,2\n", encoding="cp1252"))
    assert raw.comparisons.columns[0] == ["Müller"]
    assert [(remark.level, remark.rule) for remark in raw.remarks] == [("warn", "not UTF-8")]
    assert "line 2" in raw.remarks[0].wrong


@pytest.mark.parametrize(
    ("content", "word"),
    [
        ("study\n1".encode("utf-16"), "UTF-16"),
        (b"study,a\n\x81\x8d,1\n", "not UTF-8"),
        (b"study\tmean\nS\t1\n", "tabs"),
        (b'study,mean\n"S,1\n', "quote"),
        (b"", "empty"),
        (b"\n\n , ,\n", "empty"),
        (b"a" * 200_000 + b",b\n1,2\n", "cells"),
    ],
)
def test_csv_that_is_refused_says_why(tmp_path, content, word):
    assert word in refusal(csv_file(tmp_path, content))


def test_csv_with_far_too_many_columns_is_refused(tmp_path):
    message = refusal(csv_file(tmp_path, f"{HEAD}\nS{',' * 1_500}1\n"))
    # by hand: the 1501st column, 1501 = 2 x 676 + 5 x 26 + 19
    assert "cell BES2" in message
    assert "1000 columns" in message


def test_folder_of_csv_files(tmp_path):
    csv_file(tmp_path, f"{HEAD}\n{LINE}\n", "comparisons.csv")
    assert read_sheet(tmp_path).studies is None
    csv_file(tmp_path, "study,year\nS,2001\n", "studies.csv")
    assert read_sheet(tmp_path).studies.name == "studies.csv"


def test_folder_without_comparisons_lists_what_it_holds(tmp_path):
    csv_file(tmp_path, HEAD, "mine.csv")
    assert "it holds mine.csv" in refusal(tmp_path)


@pytest.mark.parametrize("name", ["none.xlsx", "none.csv", "none.txt", "none"])
def test_absent_file_says_so(tmp_path, name):
    assert "does not exist" in refusal(tmp_path / name)


def test_another_kind_of_file_is_refused(tmp_path):
    assert "save the sheet as .xlsx" in refusal(csv_file(tmp_path, HEAD, "a.txt"))


def test_xlsx_and_csv_of_the_same_rows_give_the_same_numbers(tmp_path):
    changes = ({}, {"control_sd": None, "note": "x"}, {"control_n": 7.0})
    by_xlsx = read_sheet(save_xlsx(tmp_path / "a.xlsx", {"comparisons": grid(*changes)}))
    lines = [",".join("" if c is None else str(c) for c in row) for row in grid(*changes)]
    by_csv = read_sheet(csv_file(tmp_path, "\n".join(lines)))
    first, second = (take_in(raw, settings()).rows for raw in (by_xlsx, by_csv))
    assert first.drop(columns="sheet").equals(second.drop(columns="sheet"))
    assert list(first["control_mean"]) == [PLAIN["control_mean"]] * 3
