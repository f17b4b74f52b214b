"""What the values of a column look like."""

from __future__ import annotations

import re
from collections import Counter
from dataclasses import dataclass

from drystone.sheet.parse import MISSING_NUMBER, parse_number
from drystone.sheet.raw import Cell, show
from drystone.words import spreads

_BINOMIAL = re.compile(r"[A-Z][a-z]+[ _][a-z-]{2,}.*")
_YEAR_IN_TEXT = re.compile(r"(?=.*[^\W\d_]{2}).*\b(1[89]|20)\d\d\b.*", re.DOTALL)
_YEARS = re.compile(r"(1[89]|20)\d\d([-_/–]\d{2,4})?")
_KINDS = frozenset(kind.casefold() for kind in spreads.SPREAD_KINDS) | {"sem", "standard error"}
_NUMBER_LIKE = re.compile(
    r"[<>≤≥~≈]?\s*[+\-−–]?\s*[\d.,]*\d[\d.,'’ ]*\s*(%|[*†‡a-z]{1,2})?|.*\d\s*(±|\+/-)\s*\d.*"
)
MOST = 3_000  # entries that are looked at


@dataclass(frozen=True)
class Shape:
    """Values of one column.

    Parameters
    ----------
    filled, distinct : entries that hold something, different texts among them
    numbers : share that is a number, or was meant as one
    whole, positive : shares that are whole and positive numbers
    names : share that looks like a species' name; cites : like a citation; years : like years
    kinds : share that names a kind of spread
    lowest, highest : of the numbers
    common : the most common texts with their counts
    texts : every entry's text, blank where missing
    """

    filled: int
    distinct: int
    numbers: float
    whole: float
    positive: float
    names: float
    cites: float
    years: float
    kinds: float
    lowest: float
    highest: float
    common: tuple[tuple[str, int], ...]
    texts: tuple[str, ...]

    @property
    def is_number(self) -> bool:
        """Whether most entries are numbers."""
        return self.numbers >= 0.6

    @property
    def is_text(self) -> bool:
        """Whether most entries are texts."""
        return self.filled > 0 and self.numbers < 0.4


def shape(cells: list[Cell]) -> Shape:
    """Shape of a column; words for a missing value count as blank."""
    texts = tuple(_text(cell) for cell in cells)
    looked = [(cell, text) for cell, text in zip(cells, texts, strict=True) if text][:MOST]
    values = [value for cell, _ in looked if (value := parse_number(cell)[0]) == value]
    size = max(len(looked), 1)
    counts = Counter(texts)
    counts.pop("", None)

    def share(pattern: re.Pattern[str]) -> float:
        return sum(bool(pattern.fullmatch(text)) for _, text in looked) / size

    return Shape(
        filled=sum(map(bool, texts)),
        distinct=len(counts),
        numbers=sum(is_number_like(text) for _, text in looked) / size,
        whole=sum(value == int(value) for value in values if abs(value) < 1e15) / size,
        positive=sum(value > 0 for value in values) / size,
        names=share(_BINOMIAL),
        cites=share(_YEAR_IN_TEXT),
        years=share(_YEARS),
        kinds=sum(text.casefold() in _KINDS for _, text in looked) / size,
        lowest=min(values, default=float("nan")),
        highest=max(values, default=float("nan")),
        common=tuple(counts.most_common()),
        texts=texts,
    )


def is_number_like(text: str) -> bool:
    """Whether a text is a number, or was meant as one: 1,234 or 4.1 ± 0.3.

    Examples
    --------
    >>> is_number_like("1.234,5"), is_number_like("Alder 2001")
    (True, False)
    """
    return not parse_number(text)[1] or _NUMBER_LIKE.fullmatch(text.strip()) is not None


def _text(cell: Cell) -> str:
    text = " ".join(show(cell).split())
    return "" if text.casefold() in MISSING_NUMBER else text
