"""Tables as the template prints them: caption, heads, rows of cells, nothing left to compute."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass


@dataclass(frozen=True)
class Cell:
    """One cell: text, where it leads, and its own place on the page (both may be blank)."""

    text: str
    href: str = ""


@dataclass(frozen=True)
class Row:
    """One row; ``anchor`` is its place, ``strong`` marks the one to look at first."""

    cells: tuple[Cell, ...]
    anchor: str = ""
    strong: bool = False


@dataclass(frozen=True)
class Shown:
    """A table. ``numeric`` says which columns are set flush right."""

    caption: str
    heads: tuple[str, ...]
    numeric: tuple[bool, ...]
    rows: tuple[Row, ...]


def shown(caption: str, heads: Sequence[str], rows: Iterable[Row]) -> Shown:
    """Build a table; a head that begins with '#' is a column of numbers."""
    return Shown(
        caption,
        tuple(head.lstrip("#") for head in heads),
        tuple(head.startswith("#") for head in heads),
        tuple(rows),
    )


def row(texts: Iterable[str | Cell], anchor: str = "", *, strong: bool = False) -> Row:
    """Build a row from texts and cells."""
    cells = tuple(text if isinstance(text, Cell) else Cell(text) for text in texts)
    return Row(cells, anchor, strong)
