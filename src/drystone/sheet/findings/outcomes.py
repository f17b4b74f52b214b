"""Study and outcome of every row, the outcome's scale, the row's unit."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator

from drystone.settings.problems import nearest
from drystone.sheet.draft import Draft, where
from drystone.sheet.headers import plain
from drystone.sheet.notes import Note
from drystone.words import levels, scales

MOST_HINTS = 50  # the search for the nearest name is slow


def check_outcomes(draft: Draft) -> Iterator[Note]:
    """Missing studies; missing and unknown outcomes; one outcome fills an absent column."""
    missing = where(~draft.has_text("study") & ~draft.was_unreadable("study"))
    yield from draft.notes(
        levels.STOP, "missing study", "study", missing, "the row names no study", "type its name"
    )
    names = list(draft.settings.outcomes)
    if "outcome" not in draft.found:
        draft.text("outcome")[:] = names[0]
        return
    blank = where(~draft.has_text("outcome") & ~draft.was_unreadable("outcome"))
    yield from draft.notes(
        levels.STOP,
        "missing outcome",
        "outcome",
        blank,
        "the row does not say what was measured",
        f"type the outcome: {', '.join(names[:10])}",
    )
    yield from _unknown(draft, names)


def check_scales(draft: Draft) -> Iterator[Note]:
    """Outcomes without a ratio scale; one finding for each."""
    rows_of = _rows_of(draft)
    for name, outcome in draft.settings.outcomes.items():
        rows = rows_of.get(name, [])
        if outcome.scale == scales.RATIO or not rows:
            continue
        yield Note(
            levels.STOP,
            "not a ratio scale",
            f"'{name}' has {_article(outcome.scale)} scale, so a ratio of its means says nothing; "
            f"its {len(rows)} rows leave",
            "analyse it elsewhere, or mend 'scale' in the config when it has a true zero and no "
            "upper bound",
            column="outcome",
            cell=draft.cell("outcome", rows[0]),
            value=name,
            leaves=tuple(rows),
        )


def check_units(draft: Draft) -> Iterator[Note]:
    """Rows whose unit is not the outcome's."""
    for name, rows in _rows_of(draft).items():
        outcome = draft.settings.outcomes.get(name)
        if outcome is None or outcome.scale != scales.RATIO:
            continue
        units = {row: unit for row in rows if (unit := draft.text("unit")[row]) is not None}
        if not units:
            continue
        counted = Counter(unit for row, unit in units.items() if row not in draft.left_out)
        wanted, origin = _wanted(outcome.unit, counted or Counter(units.values()))
        yield from draft.notes(
            levels.STOP,
            "another unit",
            "unit",
            [row for row, unit in units.items() if unit != wanted],
            lambda row, u=units, w=wanted, o=origin: (  # type: ignore[misc]
                f"the unit is '{u[row]}', but '{w}' is {o}"
            ),
            "convert both arms and type the unit, or make it an outcome of its own",
        )


def _wanted(declared: str | None, typed: Counter[str]) -> tuple[str, str]:
    if declared is not None:
        return " ".join(declared.split()), "the outcome's unit in the config"
    most = max(typed.values())
    common = min(unit for unit, count in typed.items() if count == most)
    return common, "the most common unit of this outcome (the config names none)"


def _unknown(draft: Draft, names: list[str]) -> Iterator[Note]:
    alike = {plain(name): name for name in names}
    outcomes = draft.text("outcome")
    hints: dict[str, str] = {}
    for row in where(draft.has_text("outcome")):
        typed = outcomes[row]
        if typed in draft.settings.outcomes:
            continue
        known = alike.get(plain(typed))
        if known is not None:
            outcomes[row] = known
            wrong = f"'{typed}' was read as the outcome '{known}'"
            todo = "nothing, or type the name as in the config"
            yield draft.note(levels.FIXED, "outcome spelling", "outcome", row, wrong, todo)
            continue
        if typed not in hints:
            hints[typed] = nearest(typed, names)[:300] if len(hints) < MOST_HINTS else names[0]
        yield draft.note(
            levels.STOP,
            "unknown outcome",
            "outcome",
            row,
            f"'{typed}' is no outcome of the config: {hints[typed]}",
            "mend the cell, or add the outcome to the config",
        )


def _rows_of(draft: Draft) -> dict[str, list[int]]:
    rows: dict[str, list[int]] = defaultdict(list)
    for row, name in enumerate(draft.text("outcome")):
        if name is not None:
            rows[name].append(row)
    return rows


def _article(scale: str) -> str:
    return f"an {scale}" if scale[0] in "aeiou" else f"a {scale}"
