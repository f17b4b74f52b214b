"""The sheet while it is checked: typed columns, addresses, rows that the team left out."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, field
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from drystone.settings.model import Settings
from drystone.sheet.notes import Note
from drystone.sheet.raw import RawSheet, RawTable, show
from drystone.tables.comparisons import NUMBER_COLUMNS
from drystone.words import arms

if TYPE_CHECKING:
    from drystone.sheet.answers import Answers

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]
Texts = npt.NDArray[np.object_]  # str, or None when missing
Words = str | Sequence[str] | Callable[[int], str]


def _no_answers() -> Answers:
    from drystone.sheet.answers import Answers

    return Answers()


@dataclass
class Draft:
    """The comparisons table on its way from cells to typed rows.

    Parameters
    ----------
    raw, settings : what was read, what the config says
    found : place among ``raw.comparisons.headers`` of each of our columns that the sheet has
    extras : place of every other named column, by name
    numbers, texts : the typed columns, ours and moderators, each with an entry for every row
    unreadable : by column, the entries whose cell was typed but could not be read
    left_out : entries that the team itself left out, with rule and reason
    sds : by arm, the SD to use, NaN when none
    sd_rules : by arm, where that SD came from, blank when none
    pooled : entries in which at least one SD is one value for both arms
    mean_recovered : by arm, entries whose mean was computed from another centre
    derivations : records for the derivations table
    studies : the studies table, typed; by column
    worked_out : what later findings look up again and again, by their own names
    answers : what people decided about findings
    row_digests : of the rows that an answer is about, as typed
    unnamed : entries whose row_id is a temporary name
    """

    raw: RawSheet
    settings: Settings
    found: Mapping[str, int]
    extras: Mapping[str, int]
    numbers: dict[str, Floats] = field(default_factory=dict)
    texts: dict[str, Texts] = field(default_factory=dict)
    unreadable: dict[str, Mask] = field(default_factory=dict)
    left_out: dict[int, tuple[str, str]] = field(default_factory=dict)
    sds: dict[str, Floats] = field(default_factory=dict)
    sd_rules: dict[str, Texts] = field(default_factory=dict)
    pooled: Mask = field(init=False)
    mean_recovered: dict[str, Mask] = field(init=False)
    derivations: list[dict[str, Any]] = field(default_factory=list)
    studies: dict[str, list[Any]] = field(default_factory=dict)
    worked_out: dict[Any, Any] = field(default_factory=dict)

    answers: Answers = field(default_factory=_no_answers)
    row_digests: dict[int, str] = field(default_factory=dict)
    unnamed: set[int] = field(default_factory=set)

    def __post_init__(self) -> None:
        """Begin without anything recovered."""
        self.pooled = np.zeros(self.size, dtype=bool)
        self.mean_recovered = {arm: np.zeros(self.size, dtype=bool) for arm in arms.ARMS}

    @property
    def table(self) -> RawTable:
        """The comparisons table as typed."""
        return self.raw.comparisons

    @property
    def size(self) -> int:
        """How many rows the table has."""
        return len(self.table.row_numbers)

    def place(self, column: str) -> int | None:
        """Place of a column, ours or a moderator, among the headers."""
        return self.found.get(column, self.extras.get(column))

    def cell(self, column: str, row: int) -> str:
        """Address of an entry; blank when the sheet has no such column."""
        place = self.place(column)
        return "" if place is None else self.table.address(place, row)

    def typed(self, column: str, row: int) -> str:
        """Text of an entry as typed."""
        place = self.place(column)
        return "" if place is None else show(self.table.columns[place][row])[:200]

    def number(self, column: str) -> Floats:
        """Number column of ours, NaN where missing."""
        return self.numbers[column]

    def text(self, column: str) -> Texts:
        """Text column of ours, None where missing."""
        return self.texts[column]

    def has_text(self, column: str) -> Mask:
        """Whether each entry of a text column is filled."""
        return np.array([value is not None for value in self.texts[column]], dtype=bool)

    def was_unreadable(self, column: str) -> Mask:
        """Whether each entry was typed but could not be read."""
        return self.unreadable.get(column, np.zeros(self.size, dtype=bool))

    def note(
        self, level: str, rule: str, column: str, row: int, wrong: str, todo: str, **more: Any
    ) -> Note:
        """Finding about one entry of one column."""
        cell, typed = self.cell(column, row), self.typed(column, row)
        return Note(level, rule, wrong, todo, column, row, cell, typed, **more)

    def notes(
        self, level: str, rule: str, column: str, rows: Iterable[int], wrong: Words, todo: Words
    ) -> Iterator[Note]:
        """Findings about several entries of one column; words may depend on the row."""
        for row in rows:
            yield self.note(
                level, rule, column, int(row), _words(wrong, int(row)), _words(todo, int(row))
            )


def where(mask: Mask) -> list[int]:
    """Entries for which ``mask`` is true."""
    return [int(row) for row in np.flatnonzero(mask)]


def blank_numbers(size: int) -> Floats:
    """Number column without a value."""
    return np.full(size, np.nan)


def blank_texts(size: int) -> Texts:
    """Text column without a value."""
    return np.full(size, None, dtype=object)


def is_number_column(column: str) -> bool:
    """Whether one of our columns holds numbers."""
    return column in NUMBER_COLUMNS


def _words(words: Words, row: int) -> str:
    if callable(words):
        return words(row)
    return words if isinstance(words, str) else words[row]
