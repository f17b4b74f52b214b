"""Answers to findings: what a person decided about a row, as long as the row stays as it was.

``answers.csv`` stands in the review folder, one line = one decision. A line is bound to the row's
numbers by their digest; once the row has other numbers the decision no longer holds and the
finding is asked again. Lines typed by hand leave the digest blank and are bound when they are
first read.
"""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path

import numpy as np

from drystone.sheet.draft import Draft
from drystone.sheet.headers import match_headers, require
from drystone.sheet.parse import parse_text
from drystone.sheet.read_csv import read_csv
from drystone.tables.comparisons import NUMBER_COLUMNS, NUMBERS_USED

COLUMNS = ("row", "rule", "decision", "reason", "who", "date", "row_digest")
NEEDED = ("row", "rule", "decision")
NOT_NUMBERS = frozenset({"row_id", "exclude_reason"})


@dataclass(frozen=True)
class Answer:
    """One line of answers.csv.

    Parameters
    ----------
    row : row_id; blank for a finding about no single row
    rule : rule of the finding
    decision : one of `drystone.words.decisions.DECISIONS`
    reason, who, date : as typed
    row_digest : of the row when it was answered; blank when typed by hand
    place : address in the file, such as A3
    """

    row: str
    rule: str
    decision: str
    reason: str = ""
    who: str = ""
    date: str = ""
    row_digest: str = ""
    place: str = ""

    @property
    def key(self) -> str:
        """Name under which a line without a digest is remembered."""
        parts = (self.row, self.rule, self.decision, self.reason, self.who, self.date)
        return _digest(parts)


@dataclass
class Answers:
    """Answers of a review.

    Parameters
    ----------
    by_finding : the last line about each row and rule
    bound : digests of lines that were typed without one, by `Answer.key`
    newly_bound : the same for lines that were bound just now
    """

    by_finding: Mapping[tuple[str, str], Answer] = field(default_factory=dict)
    bound: Mapping[str, str] = field(default_factory=dict)
    newly_bound: dict[str, str] = field(default_factory=dict)

    def holds(self, answer: Answer, now: str) -> bool:
        """Whether what was answered is still as it was; binds a line that has no digest."""
        then = answer.row_digest or self.bound.get(answer.key) or self.newly_bound.get(answer.key)
        if then is None:
            self.newly_bound[answer.key] = then = now
        return then == now


def read_answers(path: Path, bound: Mapping[str, str] | None = None) -> Answers:
    """Answers in the file at ``path``; none when there is no such file.

    Raises
    ------
    SheetProblem
        When the file cannot be read or lacks a needed column.
    """
    if not path.exists():
        return Answers()
    table, _ = read_csv(path)
    found = match_headers(table, COLUMNS, {}, path.name)
    require(table, found, NEEDED, path.name)
    answers: dict[tuple[str, str], Answer] = {}
    for line in range(len(table.row_numbers)):
        texts = {name: _text(table.columns[place][line]) for name, place in found.items()}
        answer = Answer(**texts, place=f"A{table.row_numbers[line]}")
        answers[answer.row, answer.rule] = answer
    return Answers(answers, dict(bound or {}))


def row_digest(draft: Draft, row: int) -> str:
    """Digest of what a row says that can decide a number; blank cells do not count.

    Taken before anything is converted or filled in, so formatting, order of rows and new columns
    change nothing.
    """
    parts = [
        f"{name}={value}"
        for name in sorted(NUMBERS_USED)
        if name not in NOT_NUMBERS and (value := _value(draft, name, row))
    ]
    return _digest(parts)


def text_digest(texts: tuple[str, ...]) -> str:
    """Digest of what findings about no single row say."""
    return _digest(texts)


def _value(draft: Draft, name: str, row: int) -> str:
    if draft.was_unreadable(name)[row]:
        return draft.typed(name, row)
    if name in NUMBER_COLUMNS:
        number = float(draft.numbers[name][row]) + 0.0
        return "" if np.isnan(number) else number.hex()
    return draft.texts[name][row] or ""


def _text(cell: object) -> str:
    """Text of a cell; the mark that keeps a spreadsheet from running it is taken off."""
    text = parse_text(cell)[0] or ""
    return text[1:] if text[:1] == "'" and text[1:2] in ("=", "+", "-", "@") else text


def _digest(parts: tuple[str, ...] | list[str]) -> str:
    text = "\x1f".join(parts).encode("utf-8", "surrogatepass")
    return hashlib.sha256(text).hexdigest()[:12]
