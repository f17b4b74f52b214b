"""Dangerous workbooks are refused before the reader sees them, with the place and a way out."""

import io
import resource
import time
import zipfile

import pytest
from sheet.typed_sheets import ods_parts, pack, sheet_xml, xlsx_parts

from drystone.sheet import scan_stream
from drystone.sheet.guard import inspect
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken

FAR = '<row r="1048576"><c r="XFD1048576"><v>1</v></c></row>'
ODS_TEXT = '<table:table-cell office:value-type="string"><text:p>x</text:p></table:table-cell>'


def refusal(parts):
    with pytest.raises(SheetProblem) as refused:
        inspect(parts if isinstance(parts, bytes) else pack(parts), "a.xlsx")
    return str(refused.value)


def broken(cells):
    return inspect(pack(xlsx_parts(sheet_xml(cells))), "a.xlsx").broken.get("comparisons", {})


def ods_broken(cells):
    return inspect(pack(ods_parts(cells)), "a.ods").broken.get("comparisons", {})


@pytest.mark.parametrize(
    "sheet",
    [
        sheet_xml(FAR),
        sheet_xml(FAR).replace("<", "<x:").replace("<x:/", "</x:").replace("xmlns=", "xmlns:x="),
        sheet_xml(FAR).replace("worksheet", "theme"),
        sheet_xml('<row r="1048576"><c r="XFC1048576"/><c><v>1</v></c></row>'),
        sheet_xml('<row r="1"/><row><c r="&#88;FD1048576"><v>1</v></c></row>'),
        ('<?xml version="1.0" encoding="UTF-16"?>' + sheet_xml(FAR)).encode("utf-16"),
    ],
    ids=["plain", "prefix", "other root", "no address", "escaped", "UTF-16"],
)
def test_far_cell_is_refused_with_its_address(sheet):
    message = refusal(xlsx_parts(sheet))
    assert "sheet 'comparisons', cell XFD1048576" in message
    assert "delete the stray cell" in message


def test_far_styled_blank_and_claimed_dimension_are_no_values():
    cells = '<row r="1048576"><c r="XFD1048576" s="1"/></row>'
    sheet = sheet_xml(cells).replace("<sheetData>", '<dimension ref="A1:XFD1048576"/><sheetData>')
    assert inspect(pack(xlsx_parts(sheet)), "a.xlsx").broken == {}


def test_used_area_is_limited():
    cells = (
        '<row r="1"><c r="A1"><v>1</v></c></row><row r="199999"><c r="ALL199999"><v>1</v></c></row>'
    )
    assert "more than 2000000 cells" in refusal(xlsx_parts(sheet_xml(cells)))


@pytest.mark.parametrize("path", ["xl/worksheets/sheet1.xml", "xl/media/a.png"])
def test_bomb_is_refused_by_what_it_unpacks_to(path):
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in xlsx_parts("").items():
            if name != path:
                archive.writestr(name, content or sheet_xml(""))
        with archive.open(path, "w") as part:
            part.write(sheet_xml("").partition("</")[0].encode())
            for _ in range(400):
                part.write(b" " * 1_000_000)
    before, start = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss, time.process_time()
    assert "unpacks to far more" in refusal(stream.getvalue())
    assert resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before < 100_000  # kB
    assert time.process_time() - start < 10


def test_size_is_counted_and_not_believed():
    content = bytearray(pack(xlsx_parts(sheet_xml("") + " " * 20_000_000)))
    # Both headers of the part now claim 10 bytes.
    size = (len(sheet_xml("")) + 20_000_000).to_bytes(4, "little")
    content = bytes(content).replace(size, (10).to_bytes(4, "little"))
    assert "a.xlsx" in refusal(content)


def test_long_shared_text_in_many_cells_is_refused():
    text = "<sst><si><t>" + "abcdefgh" * 4_000 + "</t></si></sst>"
    one = '<c r="A{0}" t="s"><v>0</v></c>'
    cells = "".join(f'<row r="{r}">{one.format(r)}</row>' for r in range(1, 4_000))
    parts = xlsx_parts(sheet_xml(cells), sharedStrings=text)
    assert "repeats long texts" in refusal(parts)


def test_long_shared_text_that_stands_once_is_fine():
    text = "<sst><si><t>" + "abcdefgh" * 4_000 + "</t></si><si><t>b</t></si></sst>"
    cells = "".join(
        f'<row r="{r}"><c r="A{r}" t="s"><v>{int(r > 1)}</v></c></row>' for r in range(1, 5_000)
    )
    assert inspect(pack(xlsx_parts(sheet_xml(cells), sharedStrings=text)), "a.xlsx").broken == {}


@pytest.mark.parametrize(
    ("sheet", "word"),
    [
        (sheet_xml("<a>" * 100_000), "too deep"),
        (sheet_xml(f'<row r="1"><c r="{"A1" * 1_000_000}"/></row>'), "too long"),
        ("<!DOCTYPE worksheet>" + sheet_xml(""), "document type"),
        (sheet_xml('<row r="x"><c><v>1</v></c></row>'), "damaged"),
        (sheet_xml('<row r="1"><c r="1A"><v>1</v></c></row>'), "damaged"),
        (sheet_xml('<row r="0"><c t="e"><v>#N/A</v></c></row>'), "damaged"),
        (sheet_xml("")[:-5], "damaged"),
    ],
    ids=["deep", "long", "doctype", "row", "address", "row 0", "cut"],
)
def test_hostile_markup_is_refused(sheet, word):
    assert word in refusal(xlsx_parts(sheet))


def test_entities_that_multiply_are_refused():
    entities = '<!ENTITY a0 "lol">' + "".join(
        f'<!ENTITY a{i} "{f"&a{i - 1};" * 10}">' for i in range(1, 10)
    )
    sheet = f"<!DOCTYPE w [{entities}]>" + sheet_xml('<row r="1"><c r="A1"><v>&a9;</v></c></row>')
    assert "a.xlsx" in refusal(xlsx_parts(sheet))


def test_too_many_elements_are_refused(monkeypatch):
    monkeypatch.setattr(scan_stream, "MOST_ELEMENTS", 1_000)
    assert "delete stray values" in refusal(xlsx_parts(sheet_xml("<row/>" * 1_001)))
    assert inspect(pack(xlsx_parts(sheet_xml("<row/>" * 900))), "a.xlsx").broken == {}


@pytest.mark.parametrize(
    "sheet",
    [
        "x" + sheet_xml(FAR),
        "<a></b>" + sheet_xml(FAR),
        sheet_xml(FAR).replace("<s", "<a></b><s", 1),
    ],
    ids=["text before", "two roots", "closed wrongly"],
)
@pytest.mark.parametrize("path", ["xl/worksheets/sheet1.xml", "xl/media/a.svg"])
def test_cells_cannot_hide_in_a_part_that_is_no_sound_xml(sheet, path):
    assert "damaged" in refusal({**xlsx_parts(sheet_xml("")), path: sheet})


def test_broken_shared_texts_are_refused():
    assert "damaged" in refusal(xlsx_parts(sheet_xml(""), sharedStrings="<sst><a></b></sst>"))
    assert "damaged" in refusal(xlsx_parts(sheet_xml(""), sharedStrings="x<sst/>"))


def test_ods_cells_count_under_any_root():
    row = f'<table:table-row table:number-rows-repeated="300000">{ODS_TEXT}</table:table-row>'
    parts = ods_parts(row)
    parts["content.xml"] = parts["content.xml"].replace("office:document-content", "office:other")
    assert "cell A300000" in refusal(parts)
    parts["content.xml"] = "x" + parts["content.xml"]
    assert "damaged" in refusal(parts)


def test_thousands_of_sheets_are_refused():
    parts = xlsx_parts(sheet_xml(""))
    one = '<sheet name="comparisons" sheetId="1" r:id="rId1"/>'
    parts["xl/workbook.xml"] = parts["xl/workbook.xml"].replace(one, one * 2_001)
    assert "damaged" in refusal(parts)


def test_pictures_may_look_as_they_like():
    parts = xlsx_parts(sheet_xml(""))
    parts["xl/media/a.svg"] = "<!DOCTYPE svg><svg><broken"
    parts["xl/media/b.svg"] = f"<svg><image href='{'A' * 2_000_000}'/>{'<g>' * 200}</svg>"
    parts["xl/media/c.png"] = bytes(range(256)) * 100
    parts["xl/charts/c.xml"] = "<c:chart xmlns:c='c'><c:f>A1</c:f><c:v>1</c:v></c:chart>"
    assert inspect(pack(parts), "a.xlsx").broken == {}


@pytest.mark.parametrize(
    ("content", "word"),
    [
        (b"", "no workbook"),
        (b"hello" * 100, "no workbook"),
        (bytes.fromhex("d0cf11e0a1b11ae1") + bytes(600), "old .xls"),
        (
            bytes.fromhex("d0cf11e0a1b11ae1") + "EncryptedPackage".encode("utf-16-le"),
            "without a password",
        ),
        (pack({"a.txt": "b"}), "no .xlsx or .ods"),
        (pack({f"p/{i}": "" for i in range(2_100)}), "more than 2000 parts"),
        (pack(xlsx_parts(sheet_xml("")))[:-30], "no workbook"),
        (pack({**xlsx_parts(sheet_xml("")), "xl/workbook.bin": "x"}), "two kinds"),
        (pack({**xlsx_parts(sheet_xml("")), "content.xml": "x"}), "two kinds"),
    ],
)
def test_what_is_no_workbook_is_refused(content, word):
    assert word in refusal(content)


def test_damaged_part_is_refused():
    content = pack(xlsx_parts(sheet_xml("<row r='1'/>" * 500)))
    at = content.index(b"xl/worksheets/sheet1.xml") + 30
    assert "damaged" in refusal(content[:at] + bytes(8) + content[at + 8 :])


def test_encrypted_part_is_refused():
    content = bytearray(pack(xlsx_parts(sheet_xml(""))))
    at = content.rindex(b"PK\x01\x02")
    content[at + 8] |= 1  # general purpose flag, bit 0, of the last entry of the directory
    assert "without a password" in refusal(bytes(content))


def test_encrypted_ods_is_refused():
    parts = ods_parts("")
    parts["META-INF/manifest.xml"] = "<manifest><encryption-data/></manifest>"
    assert "without a password" in refusal(parts)


def test_twin_parts_are_refused():
    stream = io.BytesIO(pack(xlsx_parts(sheet_xml(""))))
    with zipfile.ZipFile(stream, "a") as archive, pytest.warns(UserWarning, match="Duplicate"):
        archive.writestr("xl/workbook.xml", "<workbook/>")
    assert "same name" in refusal(stream.getvalue())


def test_errors_and_unsaved_formulas_are_found_where_they_stand():
    cells = (
        '<row r="1"><c r="A1" t="e"><v>#DIV/0!</v></c><c r="B1" t="e"><f>1/0</f><v>#REF!</v></c>'
        '<c r="C1"><f>1+1</f></c><c r="D1"><f>1+1</f><v></v></c><c r="E1"><f>1+1</f><v>2</v></c>'
        '<c r="F1" t="str"><f>""</f><v></v></c><c r="G1"/></row>'
        '<row r="7"><c r="AB7"><f t="shared" si="0"/></c></row>'
    )
    assert broken(cells) == {
        (0, 0): Broken("#DIV/0!"),
        (0, 1): Broken("#REF!"),
        (0, 2): Broken("", unsaved=True),
        (0, 3): Broken("", unsaved=True),
        (6, 27): Broken("", unsaved=True),
    }


def test_cells_without_address_are_counted_from_the_one_before():
    cells = (
        '<row><c><v>1</v></c><c t="e"><v>#N/A</v></c></row>'
        '<row r="4"><c r="C4"/><c><f>1</f></c></row>'
    )
    assert broken(cells) == {(0, 1): Broken("#N/A"), (3, 3): Broken("", unsaved=True)}


def test_ods_errors_are_found_where_they_stand():
    skip = '<table:table-row table:number-rows-repeated="4"><table:table-cell/></table:table-row>'
    row = (
        '<table:table-row><table:covered-table-cell table:number-columns-repeated="2"/>'
        '<table:table-cell table:formula="of:=1/0" office:value-type="string" '
        'office:string-value="" calcext:value-type="error"><text:p>#DIV/0!</text:p>'
        "</table:table-cell>"
        '<table:table-cell table:formula="of:=1+1"/>'
        '<table:table-cell table:formula="of:=1+1" office:value-type="float" office:value="2">'
        "<text:p>2</text:p></table:table-cell>"
        '<table:table-cell table:formula="of:=A1" office:value-type="string"><text:p>Err:502'
        "</text:p></table:table-cell>"
        '<table:table-cell calcext:value-type="error"><text:p>#N/A</text:p></table:table-cell>'
        "</table:table-row>"
    )
    assert ods_broken(skip + row) == {
        (4, 2): Broken("#DIV/0!"),
        (4, 3): Broken("", unsaved=True),
        (4, 5): Broken("Err:502"),
        (4, 6): Broken("#N/A"),
    }


@pytest.mark.parametrize(
    ("cells", "word"),
    [
        (
            '<table:table-row table:number-rows-repeated="1048570"><table:table-cell/>'
            f"</table:table-row><table:table-row>{ODS_TEXT}</table:table-row>",
            "cell A1048571",
        ),
        (
            "<table:table-row><table:table-cell table:number-columns-repeated='16383'/>"
            f"{ODS_TEXT}</table:table-row>",
            "cell XFD1",
        ),
        (
            '<table:table-row table:number-rows-repeated="9000">'
            + ODS_TEXT.replace(" ", ' table:number-columns-repeated="900" ', 1)
            + "</table:table-row>",
            "2000000 cells",
        ),
        (
            '<table:table-row table:number-rows-repeated="2000">'
            + ODS_TEXT.replace("x", "x" * 20_000).replace(
                " ", ' table:number-columns-repeated="900" ', 1
            )
            + "</table:table-row>",
            "repeats long texts",
        ),
    ],
    ids=["far row", "far column", "area", "text"],
)
def test_ods_beyond_the_limits_is_refused(cells, word):
    assert word in refusal(ods_parts(cells))


def test_ods_with_blank_rows_to_the_end_is_fine():
    cells = (
        f"<table:table-row>{ODS_TEXT}<table:table-cell table:number-columns-repeated='16383'/>"
        "</table:table-row><table:table-row table:number-rows-repeated='1048575'>"
        "<table:table-cell table:number-columns-repeated='16384'/></table:table-row>"
    )
    assert ods_broken(cells) == {}
