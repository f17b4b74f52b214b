"""From a cell to a number or a text, and what is said when it is neither."""

from __future__ import annotations

import math
import re
import unicodedata
from functools import lru_cache

from drystone.sheet.raw import ERROR_LITERALS, Broken, Cell, show

MISSING_NUMBER = frozenset(
    {"", "na", "n/a", "n.a.", "n.a", "nd", "n.d.", "nr", "n.r.", "none", "null", "missing"}
    | {"not reported", "not available", "not given", "-", "--", "–", "—", ".", "..", "…", "?"}
)
"""Words that stand for a missing number, in lower case."""

MISSING_TEXT = frozenset({"", "NA", "N/A", "n/a", "N.A.", "n.a.", "-", "--", "–", "—", "."})
"""Words that stand for a missing text; 'Na' may be sodium and 'none' a level."""

LONG = 100  # characters; longer texts are not worth remembering, and no number is as long

_PLAIN = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d+)?", re.ASCII)
_NUMBER = r"[-+−–]?\d[\d.,\s']*"
_TROUBLES: tuple[tuple[re.Pattern[str], str], ...] = tuple(
    (re.compile(pattern, re.IGNORECASE), wrong)
    for pattern, wrong in (
        (r"[+-]?(nan|inf|infinity)", "is not a finite number"),
        (r"[+-]?[\d.]+e[+-]?\d+", "is too large to be a number"),
        (r"[+-]?\d{1,3}(,\d{3})+(\.\d*)?", "has thousands separators, or a decimal comma"),
        (r"[+-]?\d{1,3}(\.\d{3})+,\d*", "has thousands separators and a decimal comma"),
        (r"[+-]?\d*,\d+", "has a decimal comma"),
        (r"[−–—]\s*[\d.]+", "has a dash in place of a minus sign"),
        (r"[+-]?\d[\d.,]*[\s'’][\d\s'’.,]*", "has a space or apostrophe between its digits"),
        (r"[<>≤≥≦≧=]+\s*" + _NUMBER, "is a bound, not a number"),
        (r"(ca\.?|circa|about|approx\.?|[~≈∼])\s*" + _NUMBER, "is approximate"),
        (r"[\d.,]+\s*(-|–|—|to|or|\.\.)\s*[\d.,]+", "is a range, or a date"),
        (r".*(±|\+-|\+/-).*", "holds a mean and a spread in one cell"),
        (_NUMBER + r"[*†‡§a-z]{1,3}", "has a mark or unit behind the number"),
        (_NUMBER + r"\s*%", "has a percent sign"),
        (r"\d{1,4}[-/.]\d{1,2}[-/.]\d{1,4}.*", "is a date"),
    )
)


def parse_number(cell: Cell) -> tuple[float, str]:
    """Number in ``cell`` (NaN when missing), and what is wrong with it (blank when nothing).

    Examples
    --------
    >>> parse_number("12.5")
    (12.5, '')
    >>> parse_number("12,5")
    (nan, 'has a decimal comma')
    """
    if isinstance(cell, str):
        return _from_text(cell) if len(cell) < LONG else (math.nan, "is not a number")
    if isinstance(cell, bool):
        return math.nan, "is true or false, not a number"
    if isinstance(cell, float | int):
        return _finite(cell)
    if cell is None:
        return math.nan, ""
    if isinstance(cell, Broken):
        return math.nan, broken_words(cell)
    return math.nan, "is a date or time, not a number"


def parse_text(cell: Cell) -> tuple[str | None, bool]:
    """Text in ``cell`` (None when missing), and whether doubled or hidden spaces were removed.

    Examples
    --------
    >>> parse_text(1999.0)
    ('1999', False)
    >>> parse_text(" Smith  2001 ")
    ('Smith 2001', True)
    """
    if isinstance(cell, Broken):
        return None, False
    typed = cell if isinstance(cell, str) else show(cell)
    return _tidy(typed) if len(typed) < LONG else _tidy.__wrapped__(typed)


@lru_cache(maxsize=8192)
def _tidy(typed: str) -> tuple[str | None, bool]:
    text = typed.strip()
    clean = " ".join(text.split()) if text.isascii() else _clean(text)
    if clean in MISSING_TEXT:
        return None, False
    return clean, clean != unicodedata.normalize("NFC", text)


def broken_words(cell: Broken) -> str:
    """What is wrong with a cell that shows no usable value."""
    if cell.unsaved:
        return "is a formula whose value was not saved"
    return "is an error value"


@lru_cache(maxsize=8192)
def _from_text(cell: str) -> tuple[float, str]:
    text = cell.strip()
    if _PLAIN.fullmatch(text):
        return _finite(float(text))
    if text.casefold() in MISSING_NUMBER:
        return math.nan, ""
    if text in ERROR_LITERALS:
        return math.nan, "is an error value"
    for pattern, wrong in _TROUBLES:
        if pattern.fullmatch(text):
            return math.nan, wrong
    return math.nan, "is not a number"


def _finite(value: float) -> tuple[float, str]:
    try:
        number = float(value)
    except OverflowError:
        number = math.inf
    if math.isfinite(number):
        return number, ""
    return math.nan, "is not a finite number"


def _clean(text: str) -> str:
    """One form for letters that can be typed in two ways; no hidden characters, no lone halves."""
    visible = "".join(c for c in text if unicodedata.category(c) not in {"Cf", "Cs"})
    return unicodedata.normalize("NFC", " ".join(visible.split()))
