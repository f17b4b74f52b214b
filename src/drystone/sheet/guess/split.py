"""Words of a header, and the unit in its brackets."""

from __future__ import annotations

import re
from functools import cache

from drystone.sheet.guess import vocabulary as known
from drystone.words import arms

_BRACKETS = re.compile(r"[(\[]([^()\[\]]*)[)\]]")
_CHUNK = re.compile(r"[^\W_]+|±|%")
_CAMEL = re.compile(r"[A-Z]+(?=[A-Z][a-z])|[A-Z]?[^\W\dA-Z_]+|[A-Z]+|\d+|\W")
_SLASHED = re.compile(r"[^\W\d_]+\d?(/[^\W_]+)+")  # a unit without brackets, such as kg/ha
_NUMBERED = re.compile(r"([a-z]+)(\d)")


def split_header(header: str) -> tuple[tuple[str, ...], str]:
    """Lower-case words of ``header``, and its unit, in brackets or with a slash.

    Examples
    --------
    >>> split_header("SD (control)")
    (('sd', 'control'), '')
    >>> split_header("treatYield [t/ha]")
    (('treat', 'yield'), 't/ha')
    >>> split_header("Xc")
    (('mean', 'c'), '')
    """
    unit, text = "", header
    for match in _BRACKETS.finditer(header):
        inside = match.group(1).strip()
        if not _is_words(inside):
            unit = inside
            text = text.replace(match.group(0), " ")
    for token in header.split():
        if _SLASHED.fullmatch(token) and not _is_words(token):
            unit = unit or token
            text = text.replace(token, " ")
    return tuple(word for chunk in _CHUNK.findall(text) for word in _words(chunk)), unit


def plain_words(text: str) -> tuple[str, ...]:
    """Lower-case words of running text, such as a codebook's, in order."""
    return tuple(_CHUNK.findall(text.casefold()))


def _is_words(inside: str) -> bool:
    """Whether brackets hold words of ours, not a unit; a small t is the tonne."""
    found = _CHUNK.findall(inside)
    return bool(found) and inside != "t" and all(word.casefold() in _vocabulary() for word in found)


def _words(chunk: str) -> list[str]:
    low = chunk.casefold()
    if low in _vocabulary():
        return [low]
    if low in _compact():
        return list(_compact()[low])
    numbered = _NUMBERED.fullmatch(low)
    if numbered and numbered.group(1) in _quantity_words():
        return [numbered.group(1), numbered.group(2)]
    parts = [part.casefold() for part in _CAMEL.findall(chunk)]
    return parts if len(parts) == 1 else [word for part in parts for word in _again(part)]


def _again(part: str) -> list[str]:
    return list(_compact().get(part, (part,))) if part not in _vocabulary() else [part]


@cache
def _quantity_words() -> frozenset[str]:
    return frozenset().union(*known.QUANTITIES.values())


@cache
def _vocabulary() -> frozenset[str]:
    rows = frozenset().union(*known.ROW_WORDS.values())
    both = known.STRONG[arms.CONTROL] | known.STRONG[arms.TREATMENT]
    return _quantity_words() | rows | both | known.FILLERS | known.LABEL_WORDS


@cache
def _compact() -> dict[str, tuple[str, str]]:
    """Quantity and arm written as one word: xc, sdt, nctrl, ctrlmean."""
    found: dict[str, tuple[str, str]] = {}
    short = {word: word for word in _quantity_words()}
    short.update({"x": "mean", "xbar": "mean", **known.COMPACT_ONLY})
    for arm in arms.ARMS:
        for name in known.STRONG[arm]:
            for letter, quantity in short.items():
                for glued in (letter + name, name + letter):
                    found.setdefault(glued, (quantity, name))
    skipped = known.NOT_COMPACT | _vocabulary()
    return {glued: pair for glued, pair in found.items() if glued not in skipped}
