"""What a workbook holds that its marked copy cannot keep, found in the parts of the zip file."""

from __future__ import annotations

import re
import zipfile
from collections import Counter
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass

_NAME = re.compile(rb"<(?:[\w.-]+:)?([A-Za-z]\w*)")
_EXTENSIONS = re.compile(rb"<(?:\w+:)?extLst[\s/>]")
_CELLS_END = b"sheetData>"

VALUES = "the values in the cells are kept"
# Parts by the start of their path, without xl/; what they are, and what a person should know.
PARTS: Mapping[str, tuple[str, str]] = {
    "charts/chart": ("charts", "the numbers behind them are kept"),
    "media/": ("images", "look at them in your own workbook"),
    "pivottables/": ("pivot tables", VALUES),
    "slicers/": ("slicers", "the filters themselves are kept"),
    "timelines/": ("timelines", "the filters themselves are kept"),
    "externallinks/externallink": ("links to other workbooks", VALUES),
    "vbaproject.bin": ("macros", "drystone never runs them"),
    "threadedcomments/": ("threads of comments", "their texts are kept as plain comments"),
    "embeddings/": ("embedded files", "open them in your own workbook"),
    "ctrlprops/": ("buttons and other form controls", "use them in your own workbook"),
    "activex/activex": ("controls that run code", "use them in your own workbook"),
    "querytables/": ("tables filled from outside", VALUES),
    "connections.xml": ("connections to data outside", VALUES),
    "richdata/": ("linked data types and pictures in cells", "look at them in your own workbook"),
    "model/": ("a data model", VALUES),
    "chartsheets/sheet": ("sheets that are one chart", "the numbers behind them are kept"),
    "dialogsheets/": ("dialog sheets", "use them in your own workbook"),
    "macrosheets/": ("macro sheets", "drystone never runs them"),
    "printersettings/": ("settings of the printer", "page size and margins are kept"),
    "revisions/": ("the record of changes", "see it in your own workbook"),
    "webextensions/": ("add-ins", "use them in your own workbook"),
}
SHAPES = ("shapes and text boxes", "read them in your own workbook")
# Elements of a sheet behind its cells; the second group counts only inside an extension list.
ELEMENTS: Mapping[str, tuple[str, str]] = {
    "customSheetView": ("views saved under a name", "the present view is kept"),
    "protectedRange": ("ranges with a password of their own", VALUES),
    "picture": ("a picture behind the cells", "look at it in your own workbook"),
    "legacyDrawingHF": ("a picture in header or footer", "the texts are kept"),
    "ignoredError": ("hints that were turned off", "a small triangle may show in a corner"),
    "sortState": ("the remembered order of sorting", "the rows stand as they are"),
    "cellWatch": ("watched cells", VALUES),
}
EXTENDED: Mapping[str, tuple[str, str]] = {
    "sparkline": ("sparklines", "the numbers behind them are kept"),
    "dataValidation": ("pick-lists that read another sheet", VALUES),
    "cfRule": ("conditional formats of a newer kind", "plain colour rules are kept"),
    "slicer": ("slicers", "the filters themselves are kept"),
}
_KEPT = re.compile(
    r"\[content_types\]\.xml|(.*/)?_rels/[^/]*\.rels|docprops/.*|mimetype|xl/(workbook\.xml|"
    r"styles\.xml|sharedstrings\.xml|calcchain\.xml|metadata\.xml|theme/.*|worksheets/[^/]*\.xml|"
    r"tables/.*|(comments/)?comments?[^/]*\.xml|persons/.*|drawings/.*|(.*/)?[^/]*\.vml|"
    r"pivotcache/.*|slicercaches/.*|timelinecaches/.*|charts/(style|colors).*|"
    r"externallinks/.*\.rels|activex/.*\.bin|media/?|model/.*)"
)


@dataclass(frozen=True)
class Loss:
    """Something that the copy lacks: what it is, how often it was found, what to know."""

    what: str
    count: int
    note: str

    def __str__(self) -> str:
        """Give the loss as one line."""
        times = f" ({self.count})" if self.count > 1 else ""
        return f"{self.what}{times}: {self.note}"


def find_losses(archive: zipfile.ZipFile, sheets: Iterable[str]) -> list[Loss]:
    """Everything in ``archive`` that a copy lacks; ``sheets`` are the parts that hold sheets."""
    counts: Counter[tuple[str, str]] = Counter()
    counts.update(_lost_parts(archive.namelist()))
    for path in archive.namelist():
        if re.fullmatch(r"xl/drawings/[^/]*\.xml", path, re.IGNORECASE):
            names = _NAME.findall(archive.read(path))
            shapes = sum(name in (b"sp", b"cxnSp") for name in names)
            counts[SHAPES] += shapes
    for path in sheets:
        counts.update(_lost_elements(archive.read(path)))
    return [Loss(what, number, note) for (what, note), number in counts.items() if number]


def _lost_parts(paths: Iterable[str]) -> Iterator[tuple[str, str]]:
    for path in paths:
        lower = path.lower()
        place = lower.removeprefix("xl/")
        kind = next((PARTS[start] for start in PARTS if place.startswith(start)), None)
        if kind is not None and not lower.endswith((".rels", "/")):
            yield kind
        elif kind is None and not lower.endswith("/") and not _KEPT.fullmatch(lower):
            yield f"the part {path}", "it is of a kind that drystone does not know"


def _lost_elements(content: bytes) -> Iterator[tuple[str, str]]:
    tail = content[content.rfind(_CELLS_END) + len(_CELLS_END) :]
    found = _EXTENSIONS.search(tail)
    plain, extended = (tail[: found.start()], tail[found.start() :]) if found else (tail, b"")
    for piece, kinds in ((plain, ELEMENTS), (extended, EXTENDED)):
        names = Counter(_NAME.findall(piece))
        for name, kind in kinds.items():
            for _ in range(names[name.encode()]):
                yield kind
