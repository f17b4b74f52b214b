"""One header of the team's table, taken apart."""

from __future__ import annotations

from dataclasses import dataclass

from drystone.sheet.guess import vocabulary as known
from drystone.sheet.guess.shapes import Shape, shape
from drystone.sheet.guess.split import plain_words, split_header
from drystone.sheet.raw import RawTable
from drystone.words import arms


@dataclass(frozen=True)
class Field:
    """One column of the team's table.

    Parameters
    ----------
    place : place among the table's headers
    header : as typed
    words : of the header, lower case, without the unit
    unit : in the header's brackets
    quantity : what the numbers are, by `vocabulary.QUANTITIES`; blank when the words do not say
    rest : words that name no quantity
    arm : the arm that the words name; blank when they name none, or both
    described : words that the codebook says about the column
    shape : of its values
    """

    place: int
    header: str
    words: tuple[str, ...]
    unit: str
    quantity: str
    rest: tuple[str, ...]
    arm: str
    described: tuple[str, ...]
    shape: Shape


def fields_of(table: RawTable, codebook: dict[str, str]) -> list[Field]:
    """Every named column of ``table``; ``codebook`` gives a description by header."""
    return [
        _field(place, header, codebook.get(header, ""), shape(table.columns[place]))
        for place, header in enumerate(table.headers)
    ]


def _field(place: int, header: str, description: str, values: Shape) -> Field:
    words, unit = split_header(header)
    described = plain_words(description)
    quantity, rest = quantity_of(words)
    arm = arm_of(rest, described=False)
    if values.is_number and description:
        quantity = quantity or quantity_of(described)[0]
        arm = arm or arm_of(described, described=True)
    return Field(place, header, words, unit, quantity, rest, arm, described, values)


def quantity_of(words: tuple[str, ...]) -> tuple[str, tuple[str, ...]]:
    """Quantity that ``words`` name, and the words that are left.

    Examples
    --------
    >>> quantity_of(("standard", "error", "rural"))
    ('se', ('rural',))
    """
    left = list(words)
    found: list[str] = []
    for phrase, quantity in known.PHRASES:
        start = _position(left, phrase)
        if start is not None:
            del left[start : start + len(phrase)]
            found.append(quantity)
    for quantity, names in known.QUANTITIES.items():
        if quantity in known.ENDS and _is_level(words):
            continue
        hits = [word for word in left if word in names]
        if hits:
            found.append(quantity)
            left = [word for word in left if word not in names]
    best = next((quantity for quantity in known.PRECEDENCE if quantity in found), "")
    return best, tuple(left)


def _is_level(words: tuple[str, ...]) -> bool:
    """Whether 'low' and 'high' name arms, as in mean_low and sd_low, and not limits."""
    core = frozenset().union(*(known.QUANTITIES[q] for q in (known.MEAN, known.SD, known.N)))
    return bool(core & set(words)) and not known.LIMITS & set(words)


def arm_of(words: tuple[str, ...], *, described: bool) -> str:
    """Arm that ``words`` name; single letters count in headers only."""
    named = [
        arm
        for arm in arms.ARMS
        if any(word in known.STRONG[arm] and (len(word) > 1 or not described) for word in words)
    ]
    return named[0] if len(named) == 1 else ""


def _position(words: list[str], phrase: tuple[str, ...]) -> int | None:
    size = len(phrase)
    return next(
        (i for i in range(len(words) - size + 1) if tuple(words[i : i + size]) == phrase), None
    )
