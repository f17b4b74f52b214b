"""Small invented sheets for the tests of the intake: as raw tables, and as files."""

from __future__ import annotations

import datetime
import io
import zipfile
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

import openpyxl

from drystone.settings.load import settings_from
from drystone.settings.model import Settings
from drystone.sheet.intake import Intake, take_in
from drystone.sheet.raw import RawSheet, RawTable

PLAIN = {
    "row_id": "r1",
    "study": "Alder 2001",
    "outcome": "yield",
    "unit": "t/ha",
    "control_mean": 4.0,
    "control_sd": 0.5,
    "control_n": 4.0,
    "treatment_mean": 5.0,
    "treatment_sd": 0.75,
    "treatment_n": 5.0,
}


def settings(**more: Any) -> Settings:
    """Config with one outcome, 'yield', unless told otherwise."""
    return settings_from({"sheet": "x.xlsx", "outcomes": {"yield": None}, **more})


def table(rows: Sequence[Mapping[str, Any]], name: str = "comparisons") -> RawTable:
    """Raw table whose columns are the keys of the rows, in order; headers stand in row 1."""
    headers = list(dict.fromkeys(key for row in rows for key in row))
    return RawTable(
        name=name,
        headers=tuple(headers),
        positions=tuple(range(len(headers))),
        columns=tuple([row.get(header, "") for row in rows] for header in headers),
        row_numbers=tuple(range(2, len(rows) + 2)),
    )


def rows(*changes: Mapping[str, Any]) -> list[dict[str, Any]]:
    """One plain row for each mapping, with its changes; row names count up unless given."""
    return [{**PLAIN, "row_id": f"r{i}", **change} for i, change in enumerate(changes, start=1)]


def take(*changes: Mapping[str, Any], studies: Sequence[Mapping] = (), **config: Any) -> Intake:
    """Intake of plain rows with changes."""
    raw = RawSheet("x.xlsx", table(rows(*changes)), table(studies, "studies") if studies else None)
    return take_in(raw, settings(**config))


def found(intake: Intake, rule: str) -> list[tuple[str, str, str]]:
    """Level, cell and row of every finding of one rule."""
    of_rule = intake.findings[intake.findings["rule"] == rule]
    return list(of_rule[["level", "cell", "row_id"]].itertuples(index=False, name=None))


def balances(intake: Intake) -> bool:
    """Whether every row is usable or in the ledger, once, and usable names are unique."""
    left = intake.ledger["sheet_row"]
    return bool(
        len(intake.usable) + len(left) == len(intake.rows)
        and left.is_unique
        and left.isin(intake.rows["sheet_row"]).all()
        and intake.usable["row_id"].is_unique
        and intake.usable["row_id"].notna().all()
    )


def save_xlsx(path: Path, sheets: Mapping[str, Sequence[Sequence[Any]]]) -> Path:
    """Workbook with the given cells, from A1 of each sheet."""
    book = openpyxl.Workbook()
    book.remove(book.active)
    for name, grid in sheets.items():
        sheet = book.create_sheet(name)
        for cells in grid:
            sheet.append(list(cells))
    # A fixed date, so that no test depends on the clock.
    book.properties.created = book.properties.modified = datetime.datetime(2020, 1, 1)
    book.save(path)
    return path


def grid(*changes: Mapping[str, Any]) -> list[list[Any]]:
    """Cells of plain rows with changes, headers first."""
    made = table(rows(*changes))
    return [list(made.headers), *map(list, zip(*made.columns, strict=True))]


_TYPES = (
    '<Types xmlns="http://schemas.openxmlformats.org/package/2006/content-types">'
    '<Default Extension="rels" '
    'ContentType="application/vnd.openxmlformats-package.relationships+xml"/>'
    '<Default Extension="xml" ContentType="application/xml"/></Types>'
)
_OFFICE = "http://schemas.openxmlformats.org/officeDocument/2006/relationships"
_MAIN = "http://schemas.openxmlformats.org/spreadsheetml/2006/main"
_PACKAGE = "http://schemas.openxmlformats.org/package/2006/relationships"


def _relations(*targets: tuple[str, str]) -> str:
    items = "".join(
        f'<Relationship Id="rId{i}" Type="{_OFFICE}/{kind}" Target="{target}"/>'
        for i, (kind, target) in enumerate(targets, start=1)
    )
    return f'<Relationships xmlns="{_PACKAGE}">{items}</Relationships>'


def xlsx_parts(sheet: str | bytes, **more: str | bytes) -> dict[str, str | bytes]:
    """Parts of a workbook whose only sheet is given as XML; ``more`` adds parts of xl/."""
    return {
        "[Content_Types].xml": _TYPES,
        "_rels/.rels": _relations(("officeDocument", "xl/workbook.xml")),
        "xl/workbook.xml": f'<workbook xmlns="{_MAIN}" xmlns:r="{_OFFICE}"><sheets>'
        '<sheet name="comparisons" sheetId="1" r:id="rId1"/></sheets></workbook>',
        "xl/_rels/workbook.xml.rels": _relations(
            ("worksheet", "worksheets/sheet1.xml"), ("sharedStrings", "sharedStrings.xml")
        ),
        "xl/worksheets/sheet1.xml": sheet,
        **{f"xl/{name}.xml": content for name, content in more.items()},
    }


def sheet_xml(cells: str) -> str:
    """Sheet of a workbook around the XML of its rows."""
    return f'<worksheet xmlns="{_MAIN}"><sheetData>{cells}</sheetData></worksheet>'


_ODS = "urn:oasis:names:tc:opendocument:xmlns"


def ods_parts(cells: str) -> dict[str, str | bytes]:
    """Parts of an .ods workbook around the XML of the rows of its only sheet."""
    return {
        "mimetype": "application/vnd.oasis.opendocument.spreadsheet",
        "META-INF/manifest.xml": f'<manifest:manifest xmlns:manifest="{_ODS}:manifest:1.0"/>',
        "content.xml": f'<office:document-content xmlns:office="{_ODS}:office:1.0" '
        f'xmlns:table="{_ODS}:table:1.0" xmlns:text="{_ODS}:text:1.0" '
        'xmlns:calcext="urn:org:documentfoundation:names:experimental:calc:xmlns:calcext:1.0">'
        '<office:body><office:spreadsheet><table:table table:name="comparisons">'
        f"{cells}</table:table></office:spreadsheet></office:body></office:document-content>",
    }


def pack(parts: Mapping[str, str | bytes]) -> bytes:
    """Zip file of the given parts."""
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    return stream.getvalue()
