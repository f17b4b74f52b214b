"""Colours and letters of the marked copy, and texts that stay texts in a spreadsheet program."""

from __future__ import annotations

import re
from collections.abc import Iterable
from copy import copy
from typing import Any

from openpyxl.cell.cell import ILLEGAL_CHARACTERS_RE
from openpyxl.styles import Alignment, Border, Font, PatternFill, Side

from drystone.words import levels

# Told apart by lightness as well as by hue, so also in grey print and with any colour vision.
COLOURS = {
    levels.STOP: "E0915A",
    levels.ASK: "F7D774",
    levels.WARN: "A9C4DA",
    levels.FIXED: "E4E6E1",
}
MEANINGS = {
    levels.STOP: "the row cannot be used until this is mended",
    levels.ASK: "a person must decide; a stated default holds until then",
    levels.WARN: "worth a look",
    levels.FIXED: "converted, with a record; nothing to do unless it is wrong",
}
FILLS = {level: PatternFill("solid", fgColor=f"FF{hue}") for level, hue in COLOURS.items()}
INK = "FF1D2733"
LINK = "FF24557F"
TITLE = Font(name="Calibri", size=16, bold=True, color=INK)
HEADING = Font(name="Calibri", size=12, bold=True, color=INK)
BODY = Font(name="Calibri", size=11, color=INK)
STRONG = Font(name="Calibri", size=11, bold=True, color=INK)
LINKED = Font(name="Calibri", size=11, color=LINK, underline="single")
WRAPPED = Alignment(wrap_text=True, horizontal="left", vertical="top")
RULE = Border(bottom=Side("thin", color="FFD8D4CA"))
LONGEST = 32_000  # a cell holds 32 767 characters
LINE_HEIGHT = 15.5  # points
_NUMBER = re.compile(r"-?\d{1,15}(\.\d+)?")
_FORMULA_LIKE = ("=", "+", "-", "@")


def clean(text: str, most: int = LONGEST) -> str:
    """Text without characters that a workbook cannot hold, cut to ``most`` characters."""
    kept = ILLEGAL_CHARACTERS_RE.sub("", text).encode("utf-8", "ignore").decode("utf-8")
    return kept if len(kept) <= most else f"{kept[: most - 4]} ..."


def put_text(cell: Any, text: str) -> None:
    """Put ``text`` into a cell of a workbook; no text becomes a formula, also not when retyped."""
    kept = clean(text)
    cell.value = kept
    if kept:
        cell.data_type = "s"
    if kept.startswith(_FORMULA_LIKE):
        cell.quotePrefix = True


def as_number(text: str) -> int | float | None:
    """Number of a text that a spreadsheet shows in the very same way; None for any other text."""
    if not _NUMBER.fullmatch(text):
        return None
    number = float(text)
    if number.is_integer():
        return int(number) if str(int(number)) == text else None
    return number if repr(number) == text else None


def fit_height(sheet: Any, row: int, texts: Iterable[tuple[str, float]]) -> None:
    """Make a row tall enough for wrapped texts, each with the width of its column in characters.

    Not every program does it by itself when it opens a file.
    """
    lines = max((_lines(text, wide) for text, wide in texts), default=1)
    sheet.row_dimensions[row].height = LINE_HEIGHT * min(lines, 25)


def _lines(text: str, wide: float) -> int:
    room = max(wide * 0.92, 1)  # words that do not fit leave gaps
    return sum(1 + int((len(part) - 1) / room) if part else 1 for part in text.split("\n"))


def colour(cell: Any, level: str) -> None:
    """Colour a cell by ``level``; letters too light for the colour are darkened."""
    cell.fill = FILLS[level]
    if _is_light(cell.font.color):
        font = copy(cell.font)
        font.color = INK
        cell.font = font


def _is_light(shade: Any) -> bool:
    """Whether letters of this colour were meant for a dark ground."""
    if shade is None:
        return False
    if shade.type == "theme":
        return bool(shade.theme in (0, 2))  # the two light colours of a theme
    if shade.type != "rgb" or not isinstance(shade.rgb, str):
        return False
    try:
        red, green, blue = (int(shade.rgb[i : i + 2], 16) for i in (2, 4, 6))
    except ValueError:
        return False
    return 0.299 * red + 0.587 * green + 0.114 * blue > 150  # the weights of ITU-R BT.601
