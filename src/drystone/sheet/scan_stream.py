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
CELLS_BEGIN = b"sheetData"  # other readers look for this element in parts of any shape

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
    *,
    required: bool = False,
) -> None:
    """Unpack one part; give its elements to the listener that the root element calls for.

    Parameters
    ----------
    listeners : gives the listener for the local name of a root element, or None to ignore the part
    required : whether the part must be sound; any other is left aside when it is not, unless it
        holds cells

    Raises
    ------
    SheetProblem
        When the part goes beyond a limit, or is damaged and matters.
    """
    scan = _Scan(part, meter, listeners, required)
    size = 0
    try:
        with archive.open(part) as packed:
            while chunk := packed.read(CHUNK):
                size += len(chunk)
                meter.count_inflated(len(chunk), part, size)
                scan.feed(chunk)
    except UNREADABLE as error:
        raise SheetProblem(damaged(str(error) or type(error).__name__), meter.file) from error
    scan.end()


#: What the zip reader raises on damaged or unusual entries; UnicodeDecodeError is a ValueError, and
#: NotImplementedError (an unknown zip version or method) is a RuntimeError.
UNREADABLE = (zipfile.BadZipFile, zlib.error, EOFError, OSError, RuntimeError, UnicodeError)


class _Scan:
    """One pass over one part."""

    def __init__(
        self,
        part: zipfile.ZipInfo,
        meter: Meter,
        listeners: Callable[[str], Listener | None],
        required: bool,
    ) -> None:
        self._part, self._meter, self._listeners = part, meter, listeners
        self._listener: Listener | None = None
        self._required = required
        self._ignored = False
        self._doctype = False
        self._hides_cells = False
        self._tail = b""
        self._fed = 0
        self._open = 0
        self._ends: list[str] = []  # its append is the cheapest end handler there is
        self._parser = expat.ParserCreate()
        self._parser.StartDoctypeDeclHandler = self._on_doctype
        self._parser.StartElementHandler = self._on_root

    def feed(self, chunk: bytes) -> None:
        self._hides_cells = self._hides_cells or CELLS_BEGIN in self._tail + chunk
        self._tail = chunk[-len(CELLS_BEGIN) :]
        if self._fed == 0 and chunk.lstrip()[:1] not in (b"<", b"\xef", b"\xfe", b"\xff"):
            self._fail("no XML")
        self._fed += len(chunk)
        if not self._ignored:
            self._parse(chunk, last=False)
        self._check()

    def end(self) -> None:
        if not self._ignored:
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
        except ValueError:  # an address that is none, too many sheets
            self._fail("addresses or sheets as no workbook has")

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

    @property
    def _matters(self) -> bool:
        return self._required or (self._listener is not None and self._listener.matters)

    def _check(self) -> None:
        if self._ignored:
            if self._hides_cells:
                self._refuse("cells in a part that is no plain sheet")
            return
        if self._doctype and self._matters:
            self._refuse("a document type declaration, as no workbook has")
        if self._listener is not None:
            self._open += self._listener.starts - len(self._ends)
            self._meter.count_elements(self._listener.starts)
            self._listener.starts = 0
            self._ends.clear()
        if self._open > DEEPEST or self._fed - self._parser.CurrentByteIndex > LONGEST_MARK:
            self._fail("elements too long or too deep")

    def _fail(self, what: str) -> None:
        """Refuse a part that matters; leave any other aside, since nothing is read from it."""
        if self._matters:
            self._refuse(what)
        self._ignored = True

    def _refuse(self, what: str) -> None:
        raise SheetProblem(damaged(f"{self._part.filename}: {what}"), self._meter.file)
