"""Looks through a workbook before anything else opens it.

The reader behind this guard holds every cell of the used rectangle in memory and reads error
values and formulas without a stored value as blanks; so both are looked for here.
"""

from __future__ import annotations

import posixpath
import zipfile
from collections.abc import Mapping
from dataclasses import dataclass, field

from drystone.sheet import limits
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken
from drystone.sheet.scan_ods import ContentScan
from drystone.sheet.scan_stream import Listener, Meter, stream
from drystone.sheet.scan_xlsx import NameScan, SheetScan, TextScan
from drystone.sheet.zip_directory import open_zip

_TEXTS = "xl/sharedstrings.xml"
_WORKBOOK, _RELATIONS = "xl/workbook.xml", "xl/_rels/workbook.xml.rels"


@dataclass(frozen=True)
class Inspection:
    """What the guard saw.

    Parameters
    ----------
    broken : cells without a usable value, by sheet, then by (row, column) from 0
    macros : True when the workbook holds macros
    """

    broken: Mapping[str, dict[tuple[int, int], Broken]] = field(default_factory=dict)
    macros: bool = False


def inspect(content: bytes, file: str) -> Inspection:
    """Look through the workbook ``content``; ``file`` is what messages call it.

    Raises
    ------
    SheetProblem
        When it is no workbook, an old, encrypted or damaged one, or larger inside than a sheet
        of comparisons can be.
    """
    with open_zip(content, file) as archive:
        names = set(archive.namelist())
        if _WORKBOOK in names:
            broken = _inspect_xlsx(archive, Meter(file))
        elif "content.xml" in names:
            broken = _inspect_ods(archive, Meter(file))
        else:
            raise SheetProblem(
                "is a zip file but no .xlsx or .ods workbook; open it in a spreadsheet program "
                "and save it as .xlsx",
                file,
            )
    macros = any(name.lower().endswith("vbaproject.bin") for name in names)
    return Inspection(broken, macros)


def _inspect_xlsx(
    archive: zipfile.ZipFile, meter: Meter
) -> dict[str, dict[tuple[int, int], Broken]]:
    names = _sheet_names(archive, meter)
    sheets: dict[str, SheetScan] = {}
    texts = TextScan()
    for part in archive.infolist():
        path = part.filename
        if path in ("xl/workbook.bin", "content.xml"):
            raise SheetProblem("is two kinds of workbook in one; save it as .xlsx", meter.file)

        def listener(root: str, path: str = path) -> Listener | None:
            if root == "sst" or path.casefold() == _TEXTS:
                return texts
            sheets[path] = SheetScan(names.get(path, path), meter)
            return sheets[path]

        required = path.casefold() == _TEXTS or path in names
        stream(archive, part, meter, listener, required=required)
    longest = max(texts.lengths, default=0)
    if longest * sum(scan.shared_cells for scan in sheets.values()) > limits.MOST_TEXT:
        _count_texts(archive, meter, sheets, texts)
    return {scan.name: scan.broken for scan in sheets.values() if scan.broken}


def _count_texts(
    archive: zipfile.ZipFile, meter: Meter, sheets: Mapping[str, SheetScan], texts: TextScan
) -> None:
    """Add up the shared texts cell by cell, which is only needed when some are long."""
    again = Meter(meter.file)
    for path, scan in sheets.items():
        counted = SheetScan(scan.name, again, texts.lengths)
        stream(archive, archive.getinfo(path), again, lambda _, counted=counted: counted)  # type: ignore[misc]


def _inspect_ods(
    archive: zipfile.ZipFile, meter: Meter
) -> dict[str, dict[tuple[int, int], Broken]]:
    content = ContentScan(meter)
    for part in archive.infolist():
        if part.filename == "META-INF/manifest.xml":
            _refuse_encrypted(archive, part, meter)
    for part in archive.infolist():
        if part.filename == "content.xml":
            stream(archive, part, meter, lambda _: content, required=True)
        else:
            stream(archive, part, meter, lambda _: None)
    return content.broken


def _refuse_encrypted(archive: zipfile.ZipFile, part: zipfile.ZipInfo, meter: Meter) -> None:
    found = NameScan("encryption-data", "")
    stream(archive, part, meter, lambda _: found, required=True)
    if found.seen:
        raise SheetProblem(
            "is encrypted; open it in a spreadsheet program and save it without a password",
            meter.file,
        )


def _sheet_names(archive: zipfile.ZipFile, meter: Meter) -> dict[str, str]:
    """Sheet names by the path of the part that holds the sheet."""
    sheets, targets = NameScan("sheet", "name"), NameScan("Relationship", "Target")
    for path, scan in ((_WORKBOOK, sheets), (_RELATIONS, targets)):
        if path in archive.namelist():
            part = archive.getinfo(path)
            stream(archive, part, meter, lambda _, scan=scan: scan, required=True)  # type: ignore[misc]
    names: dict[str, str] = {}
    for key, name in sheets.found.items():
        target = targets.found.get(key, "")
        base = "/" if target.startswith("xl/") else "/xl"
        path = posixpath.normpath(posixpath.join(base, target)).lstrip("/")
        names[path] = name
    return names
