"""The table of contents of a zip file, judged before the zip library reads it."""

from __future__ import annotations

import io
import struct
import zipfile

from drystone.sheet.problems import SheetProblem

MOST_PARTS = 2_000
LARGEST_DIRECTORY = 1_000_000  # bytes
_END = struct.Struct("<4s4H2LH")
_LOCATOR = struct.Struct("<4sLQL")
_END_64 = struct.Struct("<4sQ2H2L4Q")
_OLD_FORMAT = bytes.fromhex("d0cf11e0a1b11ae1")
_METHODS = (zipfile.ZIP_STORED, zipfile.ZIP_DEFLATED)


def open_zip(content: bytes, file: str) -> zipfile.ZipFile:
    """Open a workbook as a zip file whose directory is small and plain.

    Raises
    ------
    SheetProblem
        When it is no zip file, an old or encrypted workbook, damaged, or has too many, repeated,
        encrypted or oddly packed parts.
    """
    if content.startswith(_OLD_FORMAT):
        raise SheetProblem(_old_format(content), file)
    parts, size = _directory_size(content)
    if parts < 0:
        raise SheetProblem(
            "is no workbook (.xlsx and .ods are zip files, and this is none); open it in a "
            "spreadsheet program and save it as .xlsx",
            file,
        )
    if parts > MOST_PARTS or size > LARGEST_DIRECTORY:
        raise SheetProblem(_too_many(), file)
    try:
        archive = zipfile.ZipFile(io.BytesIO(content))
    except (zipfile.BadZipFile, ValueError, OSError, RuntimeError, struct.error) as error:
        raise SheetProblem(damaged(str(error) or type(error).__name__), file) from error
    _check_parts(archive, file)
    return archive


def damaged(what: str) -> str:
    """Sentence for a workbook that cannot be unpacked."""
    return (
        f"is damaged ({what}); open it in a spreadsheet program and save it again, or copy the "
        "comparisons into a new workbook"
    )


def _check_parts(archive: zipfile.ZipFile, file: str) -> None:
    parts = archive.infolist()
    if len(parts) > MOST_PARTS:
        raise SheetProblem(_too_many(), file)
    if len({part.filename for part in parts}) < len(parts):
        raise SheetProblem("holds two parts of the same name; save it again as .xlsx", file)
    for part in parts:
        if part.flag_bits & 0x1:
            raise SheetProblem("is encrypted; save it without a password", file)
        if part.compress_type not in _METHODS:
            raise SheetProblem("is packed in an unusual way; save it again as .xlsx", file)


def _too_many() -> str:
    return f"has more than {MOST_PARTS} parts inside, as no workbook has; save it again as .xlsx"


def _old_format(content: bytes) -> str:
    if "EncryptedPackage".encode("utf-16-le") in content:
        return "is encrypted; open it in a spreadsheet program and save it without a password"
    return "is an old .xls workbook; open it in a spreadsheet program and save it as .xlsx"


def _directory_size(content: bytes) -> tuple[int, int]:
    """Parts and bytes that the directory claims; (-1, 0) when there is no directory."""
    at = content.rfind(b"PK\x05\x06", max(0, len(content) - 65_557))
    if at < 0 or at + _END.size > len(content):
        return -1, 0
    end = _END.unpack_from(content, at)
    parts, size = int(end[4]), int(end[5])
    locator_at = at - _LOCATOR.size
    if locator_at >= 0 and content[locator_at : locator_at + 4] == b"PK\x06\x07":
        at_64 = int(_LOCATOR.unpack_from(content, locator_at)[2])
        # The zip library looks right before the locator, other readers where the locator points.
        for place in (at_64, locator_at - _END_64.size):
            if 0 <= place <= len(content) - _END_64.size:
                end_64 = _END_64.unpack_from(content, place)
                if end_64[0] == b"PK\x06\x06":
                    parts, size = max(parts, int(end_64[7])), max(size, int(end_64[8]))
        if parts == 0xFFFF or size == 0xFFFFFFFF:
            return parts, size
    return parts, size
