"""Outcomes whose name or unit says that a ratio of means is wrong, doubtful or one-sided.

A scale or a direction that the config states is an answer already, so it is not asked again.
"""

from __future__ import annotations

import re
from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from drystone.settings.model import Outcome
from drystone.sheet.draft import Draft
from drystone.sheet.findings.groups import outcome_rows
from drystone.sheet.notes import Note
from drystone.words import arms, levels, meanings, scales

MOST_UNITS = 20  # different units of one outcome that are read
DECLARE = "or state 'scale: ratio' for it in the config when zero means none of it"


@dataclass(frozen=True)
class _Kind:
    rule: str
    words: re.Pattern[str]
    wrong: str
    serious: bool = True  # asked even when the config states the scale


_KINDS = (
    _Kind(
        "no true zero",
        meanings.NO_TRUE_ZERO,
        "has no true zero, so a ratio of its means depends on the unit (another unit with a zero "
        "far away, such as kelvin, only makes every ratio nearly 1)",
    ),
    _Kind("logarithms", meanings.LOGARITHM, "is on a log scale, where a ratio means nothing"),
    _Kind(
        "change as outcome",
        meanings.CHANGE,
        "compares two states already and may be negative, so a ratio of it means nothing",
    ),
    _Kind(
        "index as outcome",
        meanings.INDEX,
        "is an index or score, and its zero may not mean none",
        serious=False,
    ),
)


def meaning_of_outcomes(draft: Draft) -> Iterator[Note]:
    """Stop outcomes that are no ratio scale by their words; warn of bounded ones and ratios."""
    for name, rows in outcome_rows(draft).items():
        outcome = draft.settings.outcomes[name]
        if outcome.scale != scales.RATIO:
            continue
        kind = _kind(draft, name, rows)
        if kind is None:
            yield from _bounded(draft, name, rows)
        elif not _declared(outcome):
            yield _about(
                draft,
                levels.STOP,
                kind.rule,
                name,
                rows,
                f"'{name}' {kind.wrong}; its {len(rows)} rows leave",
                f"analyse it elsewhere, {DECLARE}",
                leaves=tuple(rows),
            )
        elif kind.serious:
            yield _about(
                draft,
                levels.ASK,
                kind.rule,
                name,
                rows,
                f"'{name}' {kind.wrong}; the config calls it a ratio scale, so its rows are used "
                "until somebody decides",
                "set its 'scale' in the config to interval, or rename the outcome",
            )


def direction(draft: Draft) -> Iterator[Note]:
    """Ask once for each outcome of which less is better, unless the config says so."""
    for name, rows in outcome_rows(draft).items():
        outcome = draft.settings.outcomes[name]
        if "flip_sign" in outcome.model_fields_set or name in stopped_outcomes(draft):
            continue
        if meanings.LESS_IS_BETTER.search(meanings.readable(name)):
            yield _about(
                draft,
                levels.ASK,
                "direction",
                name,
                rows,
                f"of '{name}' less is better, it seems; signs stay as they are until the config "
                "says otherwise",
                "write 'flip_sign: true' or 'flip_sign: false' for it; never turn signs by hand",
            )


def stopped_outcomes(draft: Draft) -> set[str]:
    """Outcomes that leave as a whole."""
    return {
        name
        for name, rows in outcome_rows(draft).items()
        if draft.settings.outcomes[name].scale != scales.RATIO
        or (not _declared(draft.settings.outcomes[name]) and _kind(draft, name, rows) is not None)
    }


def units_of(draft: Draft, name: str, rows: list[int]) -> list[str]:
    """Unit of an outcome by the config, and those typed in its rows."""
    declared = draft.settings.outcomes[name].unit
    typed = sorted({unit for row in rows if (unit := draft.text("unit")[row]) is not None})
    return [*([declared] if declared else []), *typed[:MOST_UNITS]]


def upper_end(draft: Draft, name: str, rows: list[int]) -> float | None:
    """1 or 100 when an outcome is a share by its unit or name and its means allow it, else None."""
    units = units_of(draft, name, rows)
    texts = [meanings.readable(text) for text in (name, *units)]
    if not any("%" in text or meanings.BOUNDED.search(text) for text in texts):
        return None
    means = np.concatenate([draft.number(f"{arm}_mean")[rows] for arm in arms.ARMS])
    largest = np.nanmax(means, initial=0.0)
    percent = any("%" in text or re.search(r"per ?cent", text, re.IGNORECASE) for text in texts)
    end = 100.0 if percent or largest > 1 else 1.0
    return end if largest <= end else None


def _kind(draft: Draft, name: str, rows: list[int]) -> _Kind | None:
    texts = [meanings.readable(text) for text in (name, *units_of(draft, name, rows))]
    for kind in _KINDS:
        for text in texts:
            found = kind.words.search(text)
            if found and not (kind.words is meanings.INDEX and meanings.SOUND_INDEX.search(text)):
                return kind
    return None


def _bounded(draft: Draft, name: str, rows: list[int]) -> Iterator[Note]:
    if _declared(draft.settings.outcomes[name]):
        return
    end = upper_end(draft, name, rows)
    if end is not None:
        yield _about(
            draft,
            levels.WARN,
            "bounded outcome",
            name,
            rows,
            f"'{name}' has an upper end ({end:g}), so the ratio of its means depends on whether "
            "one counts the share or the rest",
            "state its 'scale' in the config: ratio when shares are small throughout, else bounded",
        )
    elif any(
        meanings.RATIO.search(meanings.readable(text))
        for text in (name, *units_of(draft, name, rows))
    ):
        yield _about(
            draft,
            levels.WARN,
            "ratio of ratios",
            name,
            rows,
            f"'{name}' is a ratio already, so its effect is a ratio of two ratios",
            "see that this is meant; state 'scale: ratio' for it in the config if so",
        )


def _declared(outcome: Outcome) -> bool:
    return "scale" in outcome.model_fields_set


def _about(
    draft: Draft,
    level: str,
    rule: str,
    name: str,
    rows: list[int],
    wrong: str,
    todo: str,
    leaves: tuple[int, ...] = (),
) -> Note:
    """Finding about an outcome as a whole, at its first row."""
    return Note(
        level,
        rule,
        wrong,
        todo,
        column="outcome",
        cell=draft.cell("outcome", rows[0]),
        value=name,
        leaves=leaves,
    )
