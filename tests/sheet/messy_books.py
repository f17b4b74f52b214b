"""Three messy workbooks with invented rows, made part by part, and how LibreOffice sees a file."""

from __future__ import annotations

import datetime
import io
import re
import shutil
import subprocess
import zipfile
from collections.abc import Mapping
from pathlib import Path

import openpyxl
from openpyxl.cell.rich_text import CellRichText, TextBlock
from openpyxl.cell.text import InlineFont
from openpyxl.chart import BarChart, Reference
from openpyxl.comments import Comment
from openpyxl.formatting.rule import CellIsRule
from openpyxl.styles import Font, PatternFill
from openpyxl.workbook.defined_name import DefinedName
from openpyxl.worksheet.datavalidation import DataValidation
from openpyxl.worksheet.table import Table
from sheet.typed_sheets import grid

SOFFICE = shutil.which("soffice") or shutil.which("libreoffice")
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_X14 = "http://schemas.microsoft.com/office/spreadsheetml/2009/9/main"
_XDR = "http://schemas.openxmlformats.org/drawingml/2006/spreadsheetDrawing"
# Smallest PNG there is: one transparent pixel (ISO/IEC 15948, chunks IHDR, IDAT, IEND).
PIXEL = bytes.fromhex(
    "89504e470d0a1a0a0000000d49484452000000010000000108060000001f15c4890000000a49444154789c6300"
    "0100000500010d0a2db40000000049454e44ae426082"
)


def calculated(path: Path) -> Path:
    """Formulas, stored values of several kinds, formats, comments, rules: all that can be kept.

    Columns A to J are those of `typed_sheets.PLAIN`; E to G and H to J are the two arms.
    """
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "comparisons"
    for cells in grid(*({"study": f"Alder 200{i}"} for i in range(6))):
        sheet.append([*cells])
    for cell in sheet[1]:
        cell.font, cell.fill = Font(bold=True, color="FFFFFFFF"), PatternFill("solid", "FF203040")
    sheet["K1"] = "ratio"
    for row in range(2, 8):
        sheet[f"K{row}"] = f"=H{row}/E{row}"
    sheet["F3"] = "=H3/0"  # stored as an error
    sheet["F4"] = "=2*0.25"  # never stored
    sheet["F5"] = "about 5"
    sheet["E6"].comment = Comment("read from the graph", "Robin")
    sheet["E6"] = "four"
    sheet["L1"], sheet["L2"] = "seen", datetime.date(2020, 2, 29)
    sheet["L2"].number_format = "dd.mm.yyyy"
    sheet["M1"] = "words"
    sheet["M2"] = '=""'
    sheet["M3"] = '="a"&"b"'
    sheet["E2"].number_format = "0.000"
    sheet.column_dimensions["B"].width = 33
    sheet.column_dimensions["D"].hidden = True
    sheet.row_dimensions[5].hidden = True
    sheet.freeze_panes = "C2"
    sheet.auto_filter.ref = "A1:M7"
    sheet.merge_cells("N1:P2")
    sheet["N1"] = "merged"
    pick = DataValidation("list", formula1='"yield,cover"', allow_blank=True)
    pick.add("C2:C100")
    sheet.add_data_validation(pick)
    rule = CellIsRule(operator="greaterThan", formula=["5"], fill=PatternFill(bgColor="FFFF9999"))
    sheet.conditional_formatting.add("H2:H7", rule)
    other = book.create_sheet("codes")
    other["A1"] = "=1+1"
    other["A2"] = "'=not a formula"
    other["A3"].hyperlink = "https://example.org/"
    book.defined_names["arms"] = DefinedName("arms", attr_text="comparisons!$E$2:$J$7")
    book.save(path)
    stored = {f"K{row}": "1.25" for row in range(2, 8)} | {"F3": "#DIV/0!", "M2": "", "M3": "ab"}
    sheet1 = "xl/worksheets/sheet1.xml"
    edit(path, {sheet1: lambda xml: _stored(xml, stored)})
    return edit(path, {"xl/worksheets/sheet2.xml": lambda xml: _stored(xml, {"A1": "2"})})


def drawn(path: Path) -> Path:
    """All that is lost (chart, picture, text box, sparkline, newer rules ...), and rich text."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "comparisons"
    for cells in grid({"treatment_sd": 0}, {"control_n": "4-6"}, {}):
        sheet.append(cells)
    soft = InlineFont(i=True)
    sheet["B4"] = CellRichText("Alder ", TextBlock(soft, "et al."), " 2001")
    sheet["J2"].comment = Comment(
        "[Threaded comment]\n\nYour version allows you to read this.\n\nComment:\n    which n?",
        "tc={00000000-0000-0000-0000-000000000001}",
    )
    chart = BarChart()
    chart.add_data(Reference(sheet, min_col=5, min_row=1, max_row=4), titles_from_data=True)
    sheet.add_chart(chart, "M2")
    book.create_chartsheet("as a chart").add_chart(BarChart())
    book.save(path)
    extension = (
        f'<extLst><ext uri="{{05C60535-1F16-4fd2-B633-F4F36F0B64E0}}" xmlns:x14="{_X14}">'
        "<x14:sparklineGroups><x14:sparklineGroup><x14:sparklines><x14:sparkline/>"
        "<x14:sparkline/></x14:sparklines></x14:sparklineGroup></x14:sparklineGroups></ext>"
        f'<ext uri="{{78C0D931-6437-407d-A8EE-F0AAD7539E65}}" xmlns:x14="{_X14}">'
        "<x14:conditionalFormattings><x14:conditionalFormatting><x14:cfRule type='iconSet'/>"
        "</x14:conditionalFormatting></x14:conditionalFormattings></ext></extLst>"
    )
    box = (
        f'<xdr:twoCellAnchor xmlns:xdr="{_XDR}"><xdr:sp><xdr:txBody/></xdr:sp>'
        "<xdr:clientData/></xdr:twoCellAnchor>"
    )
    return edit(
        path,
        {
            "xl/worksheets/sheet1.xml": lambda xml: _before_end(xml, extension, "worksheet"),
            "xl/drawings/drawing1.xml": lambda xml: _before_end(xml, box, r"(?:\w+:)?wsDr"),
        },
        {
            "xl/media/image1.png": PIXEL,
            "xl/threadedComments/threadedComment1.xml": b"<ThreadedComments/>",
            "xl/persons/person.xml": b"<personList/>",
            "xl/slicers/slicer1.xml": b"<slicers/>",
            "xl/printerSettings/printerSettings1.bin": b"\1\2",
            "xl/newThings/thing1.xml": b"<thing/>",
        },
    )


def tangled(path: Path) -> Path:
    """Macros, a link to another workbook, a table, shared formulas, and our own sheet names."""
    book = openpyxl.Workbook()
    sheet = book.active
    sheet.title = "comparisons"
    for cells in grid({}, {"control_mean": -4}, {"treatment_n": None}, {}):
        sheet.append(cells)
    sheet["K1"] = "doubled"
    sheet.add_table(Table(displayName="rows", ref="A1:K5"))
    sheet.protection.sheet = True
    book.create_sheet("Findings")["A1"] = "ours already"
    book.create_sheet("marked copy").sheet_state = "hidden"
    book.defined_names["far"] = DefinedName("far", attr_text="[1]Elsewhere!$A$1")
    book.save(path)
    shared = "".join(
        f'<c r="K{row}"><f t="shared" si="0"{first}</f><v>8</v></c>'.replace("/f>", "/f>")
        for row, first in (
            (2, ' ref="K2:K5">E2*2'),
            (3, ">"),
            (4, ">"),
            (5, ">"),
        )
    )
    cells = re.findall(r'<c r="K\d"><f.*?</c>', shared)

    def put_cells(xml: str) -> str:
        for row, cell in zip(range(2, 6), cells, strict=True):
            xml = re.sub(rf'(<row r="{row}".*?)(</row>)', rf"\1{cell}\2", xml, count=1)
        return xml

    link = f'<externalLink xmlns="{_MAIN}"><externalBook/></externalLink>'
    return edit(
        path,
        {"xl/worksheets/sheet1.xml": put_cells},
        {
            "xl/vbaProject.bin": b"\0macro",
            "xl/externalLinks/externalLink1.xml": link.encode(),
            "xl/embeddings/oleObject1.bin": b"\0",
            "xl/pivotTables/pivotTable1.xml": b"<pivotTableDefinition/>",
        },
    )


def edit(path: Path, changes: Mapping, more: Mapping[str, bytes] | None = None) -> Path:
    """Change parts of a workbook by functions of their XML; add more parts."""
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    for name, change in changes.items():
        parts[name] = change(parts[name].decode()).encode()
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in {**parts, **(more or {})}.items():
            archive.writestr(name, content)
    path.write_bytes(stream.getvalue())
    return path


def reopened(path: Path, folder: Path, kind: str) -> Path:
    """What LibreOffice makes of a file when it opens it and saves it as ``kind``."""
    profile = f"-env:UserInstallation=file://{folder / 'profile'}"
    command = [str(SOFFICE), profile, "--headless", "--convert-to", kind, "--outdir", str(folder)]
    done = subprocess.run([*command, str(path)], capture_output=True, text=True, timeout=120)
    made = folder / f"{path.stem}.{kind.split(':')[0]}"
    assert made.exists(), done.stderr
    return made


def _stored(xml: str, values: Mapping[str, str]) -> str:
    """Put last values behind formulas, as a spreadsheet program stores them."""
    for address, value in values.items():
        number = re.fullmatch(r"-?[\d.]+", value)
        kind = "" if number else ' t="e"' if value.startswith("#") else ' t="str"'
        pattern = rf'<c r="{address}"( s="\d+")?><f>(.*?)</f><v ?/?>(</v>)?</c>'
        xml, times = re.subn(pattern, rf'<c r="{address}"\1{kind}><f>\2</f><v>{value}</v></c>', xml)
        assert times == 1, address
    return xml


def _before_end(xml: str, piece: str, root: str) -> str:
    made, times = re.subn(rf"(</{root}>\s*)$", lambda end: piece + end.group(1), xml)
    assert times == 1
    return made
