"""Cells that cannot be read: numbers that are none, error values, formulas without a value."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, Floats, Texts, blank_numbers, blank_texts, where
from drystone.sheet.findings.replication import COUNTS, read_ranges
from drystone.sheet.notes import Note
from drystone.sheet.parse import broken_words, parse_number, parse_text
from drystone.sheet.raw import ERROR_LITERALS, Broken, Cell, show
from drystone.tables.comparisons import COLUMNS, NUMBER_COLUMNS, NUMBERS_USED
from drystone.words import arms, levels

NEEDED_NUMBERS = frozenset(
    f"{arm}_{what}" for arm in arms.ARMS for what in ("mean", "n", "sd", "spread", "lower", "upper")
) | {"confidence_percent"}
SPREAD_NUMBERS = frozenset(
    f"{arm}_{what}" for arm in arms.ARMS for what in ("q1", "q3", "min", "max")
) | frozenset(
    [
        "pooled_spread",
        "difference_lower",
        "difference_upper",
        "grand_mean",
        "number_of_means",
        "error_df",
        "test_value",
    ]
)
NEEDED_TEXTS = frozenset(NUMBERS_USED) - frozenset(NUMBER_COLUMNS)
NEARLY_ALL = 0.8  # share of numbers in a moderator from which the rest looks like a mistake

UNREADABLE = "unreadable cell"
ERROR = "error value"
SPACES = "hidden spaces"


def read_cells(draft: Draft) -> Iterator[Note]:
    """Type every column of the table, and say which cells could not be read."""
    for name in COLUMNS:
        place = draft.found.get(name)
        if place is None:
            _absent(draft, name)
        elif name in NUMBER_COLUMNS:
            yield from _number_column(draft, name, draft.table.columns[place])
        else:
            yield from _text_column(draft, name, draft.table.columns[place])
    for name, place in draft.extras.items():
        yield from _moderator(draft, name, draft.table.columns[place])


def mixed_columns(draft: Draft) -> Iterator[Note]:
    """Moderators that are numbers but for a few cells, and so are taken as text."""
    for name in draft.extras:
        if name not in draft.texts:
            continue
        cells = draft.table.columns[draft.extras[name]]
        filled = where(draft.has_text(name))
        odd = [row for row in filled if parse_number(cells[row])[1]]
        if filled and odd and len(odd) <= (1 - NEARLY_ALL) * len(filled):
            yield from draft.notes(
                levels.WARN,
                "number column with text",
                name,
                odd,
                lambda row, name=name, cells=cells: (  # type: ignore[misc]
                    f"nearly all of '{name}' are numbers, but this cell "
                    f"{parse_number(cells[row])[1]}; the whole column is taken as text"
                ),
                "type a plain number, or leave the cell blank",
            )


def _absent(draft: Draft, name: str) -> None:
    if name in NUMBER_COLUMNS:
        draft.numbers[name] = blank_numbers(draft.size)
    else:
        draft.texts[name] = blank_texts(draft.size)


def _number_column(draft: Draft, name: str, cells: list[Cell]) -> Iterator[Note]:
    values, wrongs = _numbers(cells)
    draft.numbers[name] = values
    if name in COUNTS and wrongs:
        yield from read_ranges(draft, name, cells, values, wrongs)
    if not wrongs:
        return
    draft.unreadable[name] = np.isin(np.arange(draft.size), list(wrongs))
    needed = name in NEEDED_NUMBERS
    for row, wrong in wrongs.items():
        rule = ERROR if _is_error(cells[row]) else UNREADABLE
        level, effect = levels.WARN, "; it counts as missing"
        if needed:
            level, effect = levels.STOP, ""
        elif name in SPREAD_NUMBERS:
            level, effect = levels.ASK, "; no SD is computed from it until somebody decides"
        yield draft.note(level, rule, name, row, f"the cell {wrong}{effect}", _todo(cells[row]))


def _text_column(draft: Draft, name: str, cells: list[Cell]) -> Iterator[Note]:
    values, errors, respaced = _texts(cells)
    draft.texts[name] = values
    if errors:
        draft.unreadable[name] = np.isin(np.arange(draft.size), errors)
    level = levels.STOP if name in NEEDED_TEXTS else levels.WARN
    for row in errors:
        yield draft.note(
            level, ERROR, name, row, f"the cell {_error(cells[row])}", _todo(cells[row])
        )
    if name in NEEDED_TEXTS:
        yield from draft.notes(
            levels.FIXED,
            SPACES,
            name,
            respaced,
            "the text holds doubled spaces or hidden characters; they were taken out",
            "nothing, unless two names were meant to differ by them",
        )


def _moderator(draft: Draft, name: str, cells: list[Cell]) -> Iterator[Note]:
    numbers, wrongs = _numbers(cells)
    errors = [row for row in wrongs if _is_error(cells[row])]
    if len(wrongs) == len(errors) and not np.isnan(numbers).all():
        draft.numbers[name] = numbers
    else:
        draft.texts[name], errors, _ = _texts(cells)
    yield from draft.notes(
        levels.WARN,
        ERROR,
        name,
        errors,
        lambda row: f"the cell {_error(cells[row])}; it counts as missing",
        lambda row: _todo(cells[row]),
    )


def _numbers(cells: list[Cell]) -> tuple[Floats, dict[int, str]]:
    parsed = [parse_number(cell) for cell in cells]
    values = np.array([value for value, _ in parsed], dtype=np.float64)
    return values, {row: wrong for row, (_, wrong) in enumerate(parsed) if wrong}


def _texts(cells: list[Cell]) -> tuple[Texts, list[int], list[int]]:
    parsed = [parse_text(cell) for cell in cells]
    values = blank_texts(len(cells))
    values[:] = [value for value, _ in parsed]
    errors = [row for row, cell in enumerate(cells) if _is_error(cell)]
    values[errors] = None
    return values, errors, [row for row, (_, changed) in enumerate(parsed) if changed]


def _is_error(cell: Cell) -> bool:
    return isinstance(cell, Broken) or (
        isinstance(cell, str) and cell[:1] == "#" and cell.strip() in ERROR_LITERALS
    )


def _error(cell: Cell) -> str:
    return broken_words(cell if isinstance(cell, Broken) else Broken(show(cell)))


def _todo(cell: Cell) -> str:
    if isinstance(cell, Broken) and cell.unsaved:
        return "open the workbook in a spreadsheet program, let it calculate, and save it"
    if _is_error(cell):
        return "mend the formula, or type the value"
    return (
        "type one plain number with a point, such as 12.5; leave the cell blank when it is missing"
    )
