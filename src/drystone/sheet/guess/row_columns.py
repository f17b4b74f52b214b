"""Columns of the row as a whole: study, outcome, unit, names, dates; scored, best first."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass

from drystone.sheet.guess import vocabulary as known
from drystone.sheet.guess.arm_columns import Guess
from drystone.sheet.guess.fields import Field
from drystone.tables.comparisons import COLUMNS
from drystone.words import spreads

ENOUGH = 2.0


@dataclass(frozen=True)
class _Scored:
    """How well a column fits one of ours, and why."""

    score: float
    ours: str
    field: Field
    reason: str


def row_columns(
    fields: Sequence[Field], taken: set[int], study: Field | None = None
) -> list[Guess]:
    """Guesses for columns that do not belong to an arm; each column is used once.

    Parameters
    ----------
    taken : places of columns that serve already
    study : the study's column when it is known already
    """
    free = [f for f in fields if f.place not in taken and f.shape.filled]
    scored = [item for field in free for ours in known.ROW_WORDS for item in _score(field, ours)]
    chosen: dict[str, _Scored] = {}
    used: set[int] = set()
    for item in sorted(scored, key=lambda s: (-s.score, s.field.place)):
        if item.score < ENOUGH or item.ours in chosen or item.field.place in used:
            continue
        if item.ours == "date":
            continue  # needs the study, below
        chosen[item.ours] = item
        used.add(item.field.place)
    if study is None and "study" in chosen:
        study = chosen["study"].field
    date = _date(scored, study, used)
    if date is not None:
        chosen["date"] = date
        used.add(date.field.place)
    guesses = [
        Guess(item.ours, item.field.header, item.reason, item.field.place)
        for item in chosen.values()
    ]
    order = list(COLUMNS)
    guesses += _kinds(free, used)
    return sorted(guesses, key=lambda guess: order.index(guess.ours))


def _score(field: Field, ours: str) -> list[_Scored]:
    """Score of ``field`` as our column ``ours``: words of the header, codebook, values."""
    words = set(field.words) - known.FILLERS - known.FILLERS_OF.get(ours, frozenset())
    names = known.ROW_WORDS[ours]
    hits = [word for word in field.words if word in names]
    score, reasons = 0.0, []
    if words and words <= names:
        score, reasons = 3.0, [f"'{' '.join(hits)}' in the header"]
    elif hits and (field.words[0] in names or field.words[-1] in names):
        score, reasons = 1.0, [f"'{hits[0]}' in the header"]
    if names & set(field.described):
        score += 1.0
        reasons.append("so says the codebook")
    more, reason = _by_values(field, ours)
    if reason:
        reasons.append(reason)
    return [_Scored(score + more, ours, field, "; ".join(reasons))] if score + more > 0 else []


def _by_values(field: Field, ours: str) -> tuple[float, str]:
    """What the values add; a large minus where they rule the column out."""
    values = field.shape
    rule_out = (-9.0, "")
    if ours == "row_id":
        unique = values.distinct == values.filled == len(values.texts)
        return (0.0, "every value differs") if unique else rule_out
    if ours == "species" and values.names >= 0.6:
        return 2.0, "values look like species"
    if ours == "study" and values.is_text and values.cites >= 0.5:
        return 2.0, "values look like citations"
    if ours == "outcome":
        if not values.is_text or values.distinct > max(5, 0.5 * values.filled):
            return rule_out
        return 0.5, f"{values.distinct} different values"
    if ours in ("unit", "species", "site", "note") and not values.is_text:
        return rule_out
    if ours == "note":
        longest = max((len(text) for text, _ in values.common[:50]), default=0)
        return (1.0, "long texts") if longest > 40 else (0.0, "")
    if ours == "exclude_reason" and (not values.is_text or values.filled == len(values.texts)):
        return rule_out
    if ours == "study":
        return 0.0, f"{values.distinct} different values"
    return 0.0, ""


def _date(scored: Sequence[_Scored], study: Field | None, used: set[int]) -> _Scored | None:
    """Column of dates that differ within a study; a year of publication does not."""
    for item in sorted(scored, key=lambda s: (-s.score, s.field.place)):
        if item.ours != "date" or item.score < ENOUGH or item.field.place in used:
            continue
        if study is not None and _varies(study.shape.texts, item.field.shape.texts):
            reason = f"{item.reason}; differs within studies, kept as text"
            return _Scored(item.score, "date", item.field, reason)
    return None


def _varies(studies: Sequence[str], dates: Sequence[str]) -> bool:
    seen: dict[str, set[str]] = defaultdict(set)
    for study, date in zip(studies, dates, strict=True):
        if study and date:
            seen[study].add(date)
    return any(len(found) > 1 for found in seen.values())


def _kinds(free: Sequence[Field], used: set[int]) -> list[Guess]:
    """Text columns whose values are kinds of spread; one serves both arms."""
    found = [f for f in free if f.shape.kinds >= 0.8 and f.place not in used and f.shape.is_text]
    if not found:
        return []
    reason = f"values are kinds of spread ({spreads.SD}, {spreads.SE}, ...)"
    by_arm = {field.arm: field for field in reversed(found)}
    return [
        Guess(f"{arm}_spread_kind", field.header, reason, field.place)
        for arm in ("control", "treatment")
        for field in [by_arm.get(arm) or found[0]]
    ]
