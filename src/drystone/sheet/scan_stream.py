"""Streams one XML part of a workbook past a listener, within limits of size, depth and length."""

from __future__ import annotations

import zipfile
import zlib
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any, Protocol
from xml.parsers import expat

from drystone.sheet import limits
from drystone.sheet.problems import SheetProblem
from drystone.sheet.zip_directory import damaged

CHUNK = 65_536
MOST_INFLATED = 150_000_000  # bytes, all parts together, as counted and not as claimed
MOST_SQUEEZED = 200  # times; a part that unpacks to more than this is no sheet
SMALL = 5_000_000  # bytes; below this a part may be squeezed as much as it likes
MOST_ELEMENTS = 5_000_000  # in all sheets together; a number takes two
DEEPEST = 100  # elements within elements
LONGEST_MARK = 1_000_000  # bytes of one tag

Start = Callable[[str, dict[str, str]], None]


class Listener(Protocol):
    """What a part of a workbook is read for.

    ``starts`` counts the elements heard since it was last set to 0. ``matters`` says whether
    damage in the part is worth a refusal: pictures and charts may look as they like.
    """

    starts: int
    matters: bool

    def attach(self, parser: Any) -> Start:
        """Get hold of the parser; give the function that is called at every element."""

    def close(self) -> None:
        """Take note that the part ended."""


@dataclass
class Meter:
    """What was used of the limits so far, in all parts of one workbook."""

    file: str
    inflated: int = 0
    elements: int = 0
    cells: int = 0
    text: int = 0

    def count_inflated(self, size: int, part: zipfile.ZipInfo, of_part: int) -> None:
        """Add unpacked bytes."""
        self.inflated += size
        squeezed = of_part > MOST_SQUEEZED * max(part.compress_size, 1)
        if self.inflated > MOST_INFLATED or (of_part > SMALL and squeezed):
            raise SheetProblem(
                f"unpacks to far more than a sheet of numbers can hold ({part.filename}); copy "
                "the comparisons into a new workbook",
                self.file,
            )

    def count_elements(self, number: int) -> None:
        """Add elements of any part."""
        self.elements += number
        if self.elements > MOST_ELEMENTS:
            raise SheetProblem(limits.too_many_cells(), self.file)

    def count_area(self, rows: int, columns: int, sheet: str) -> None:
        """Add the used rectangle of a sheet, counted from A1."""
        self.check_area(rows, columns, sheet)
        self.cells += rows * columns

    def check_area(self, rows: int, columns: int, sheet: str) -> None:
        """Refuse a rectangle that does not fit beside those counted before."""
        if self.cells + rows * columns > limits.MOST_CELLS:
            raise SheetProblem(limits.too_many_cells(), self.file, sheet)

    def count_text(self, size: int, sheet: str) -> None:
        """Add characters, each repeat counted."""
        self.text += size
        if self.text > limits.MOST_TEXT:
            raise SheetProblem(
                "repeats long texts so often that they would not fit in memory; copy the "
                "comparisons into a new workbook",
                self.file,
                sheet,
            )


def stream(
    archive: zipfile.ZipFile,
    part: zipfile.ZipInfo,
    meter: Meter,
    listeners: Callable[[str], Listener | None],
) -> None:
    """Unpack one part; give its elements to the listener that the root element calls for.

    Parameters
    ----------
    listeners : gives the listener for the local name of a root element, or None to ignore the part

    Raises
    ------
    SheetProblem
        When the part goes beyond a limit, or is damaged and has a listener.
    """
    scan = _Scan(part, meter, listeners)
    size = 0
    try:
        with archive.open(part) as packed:
            while chunk := packed.read(CHUNK):
                size += len(chunk)
                meter.count_inflated(len(chunk), part, size)
                scan.feed(chunk)
    except (zipfile.BadZipFile, zlib.error, EOFError, OSError, RuntimeError) as error:
        raise SheetProblem(damaged(error), meter.file) from error
    scan.end()


class _Scan:
    """One pass over one part."""

    def __init__(
        self, part: zipfile.ZipInfo, meter: Meter, listeners: Callable[[str], Listener | None]
    ) -> None:
        self._part, self._meter, self._listeners = part, meter, listeners
        self._listener: Listener | None = None
        self._ignored = False
        self._doctype = False
        self._fed = 0
        self._open = 0
        self._ends: list[str] = []  # its append is the cheapest end handler there is
        self._parser = expat.ParserCreate()
        self._parser.StartDoctypeDeclHandler = self._on_doctype
        self._parser.StartElementHandler = self._on_root

    def feed(self, chunk: bytes) -> None:
        if self._ignored:
            return
        if self._fed == 0 and chunk.lstrip()[:1] not in (b"<", b"\xef", b"\xfe", b"\xff"):
            self._ignored = True
            return
        self._fed += len(chunk)
        self._parse(chunk, last=False)
        self._check()

    def end(self) -> None:
        if self._ignored:
            return
        self._parse(b"", last=True)
        self._check()
        if self._listener is not None and not self._ignored:
            self._listener.close()

    def _parse(self, chunk: bytes, *, last: bool) -> None:
        try:
            self._parser.Parse(chunk, last)
        except expat.ExpatError as error:
            self._fail(f"{expat.ErrorString(error.code)}, line {error.lineno}")
        except SheetProblem:
            raise
        except ValueError:  # an address or a row number that is none
            self._fail("an address that is none")

    def _on_doctype(self, *_: object) -> None:
        self._doctype = True

    def _on_root(self, name: str, attributes: dict[str, str]) -> None:
        listener = None if self._ignored else self._listeners(name.rpartition(":")[2])
        if listener is None:
            self._ignored = True
            self._parser.StartElementHandler = None
            return
        self._listener = listener
        heard = listener.attach(self._parser)
        self._parser.StartElementHandler = heard
        self._parser.EndElementHandler = self._ends.append
        heard(name, attributes)

    def _check(self) -> None:
        listener = self._listener
        if self._ignored or listener is None:
            return
        if self._doctype and listener.matters:
            raise SheetProblem(
                f"holds a document type declaration ({self._part.filename}), as no workbook has; "
                "save it again as .xlsx",
                self._meter.file,
            )
        self._open += listener.starts - len(self._ends)
        self._meter.count_elements(listener.starts)
        listener.starts = 0
        self._ends.clear()
        if self._open > DEEPEST or self._fed - self._parser.CurrentByteIndex > LONGEST_MARK:
            raise SheetProblem(
                f"has elements too long or too deep ({self._part.filename}); copy the comparisons "
                "into a new workbook",
                self._meter.file,
            )

    def _fail(self, what: str) -> None:
        if self._listener is None or not self._listener.matters:
            self._ignored = True
            return
        message = f"{self._part.filename}: {what}"
        raise SheetProblem(damaged(ValueError(message)), self._meter.file)
