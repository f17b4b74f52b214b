"""Outcomes of a sheet with their units and scales, guessed from its columns."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

from drystone.sheet.guess import vocabulary as known
from drystone.sheet.guess.fields import Field
from drystone.sheet.guess.split import plain_words
from drystone.sheet.headers import plain
from drystone.words import scales

UNNAMED = "outcome"


@dataclass(frozen=True)
class OutcomeGuess:
    """One outcome.

    Parameters
    ----------
    name : as most rows spell it
    rows : how many rows have it
    unit : blank when unknown
    scale : one of `drystone.words.scales.SCALES`
    reason : why this unit and scale, in a few words
    """

    name: str
    rows: int
    unit: str
    scale: str
    reason: str


def guess_outcomes(
    columns: Mapping[str, Field], size: int, unit_in_header: str
) -> list[OutcomeGuess]:
    """Outcomes, most frequent first.

    Parameters
    ----------
    columns : the team's column of each of ours
    size : rows of the table
    unit_in_header : unit that stands in the header of a mean
    """
    names = columns["outcome"].shape.texts if "outcome" in columns else ("",) * size
    units = columns["unit"].shape.texts if "unit" in columns else ("",) * size
    groups: dict[str, Counter[str]] = defaultdict(Counter)
    of_group: dict[str, Counter[str]] = defaultdict(Counter)
    for name, unit in zip(names, units, strict=True):
        if "outcome" in columns and not name:
            continue
        key = plain(name) or name
        groups[key][name] += 1
        of_group[key].update([unit] if unit else [])
    guesses = [
        _outcome(spelt, of_group[key], unit_in_header if "unit" not in columns else "")
        for key, spelt in groups.items()
    ]
    return sorted(guesses, key=lambda guess: -guess.rows)


def _outcome(spelt: Counter[str], units: Counter[str], unit_in_header: str) -> OutcomeGuess:
    name, rows = spelt.most_common(1)[0][0], sum(spelt.values())
    unit = units.most_common(1)[0][0] if units else unit_in_header
    reasons = list(_unit_reasons(units, unit))
    scale, why = _scale(name, unit)
    others = [other for other in spelt if other != name]
    if others:
        reasons.append("also spelt " + ", ".join(f"'{other}'" for other in others[:3]))
    return OutcomeGuess(name or UNNAMED, rows, unit, scale, "; ".join([*why, *reasons]))


def _unit_reasons(units: Counter[str], unit: str) -> Iterator[str]:
    if len(units) > 1:
        others = sum(units.values()) - units[unit]
        yield f"the most common unit; {others} rows have another"
    elif units:
        yield "its only unit"
    elif unit:
        yield "unit in a header"
    else:
        yield "no unit found"


def _scale(name: str, unit: str) -> tuple[str, list[str]]:
    words = {*plain_words(name.replace("_", " ")), *plain_words(unit.replace("_", " "))}
    if known.NO_ZERO & words or "°" in unit:
        return "interval", ["its zero is a convention, so a ratio says nothing"]
    if known.BOUNDED & words:
        return "bounded", ["it has an upper bound; a ratio depends on which side is counted"]
    return scales.RATIO, []
