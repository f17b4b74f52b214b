"""Columns that hold one of a few words; what holds when they are blank; meanings not used yet."""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from functools import lru_cache

import numpy as np

from drystone.settings.problems import nearest
from drystone.sheet.draft import Draft, Mask, where
from drystone.sheet.headers import plain
from drystone.sheet.notes import Note
from drystone.tables.comparisons import COLUMNS
from drystone.words import arms, levels, spreads

ALLOWED: dict[str, tuple[str, ...]] = {
    name: tuple(column.metadata["allowed"])
    for name, column in COLUMNS.items()
    if column.metadata.get("allowed")
}
DECIDES_AN_SD = frozenset(f"{arm}_spread_kind" for arm in arms.ARMS) | {"pooled_kind"}


def check_words(draft: Draft) -> Iterator[Note]:
    """Blank words that are not allowed, after trying other case and spacing."""
    for name, allowed in ALLOWED.items():
        values = draft.text(name)
        for row in where(draft.has_text(name)):
            if values[row] in allowed:
                continue
            typed, values[row] = values[row], _same_word(values[row], allowed)
            if values[row] is None:
                yield _unknown(draft, name, row, typed, allowed)
            else:
                wrong = f"'{typed}' was read as '{values[row]}'"
                yield draft.note(levels.FIXED, "word spelling", name, row, wrong, "nothing")
    yield from _designs(draft)


def fill_defaults(draft: Draft) -> Iterator[Note]:
    """Fill blank kinds from the config; two limits without a kind are a confidence interval."""
    defaults = draft.settings.defaults
    for arm in arms.ARMS:
        kinds, column = draft.text(f"{arm}_spread_kind"), f"{arm}_spread_kind"
        blank = _blank(draft, column)
        spread = ~np.isnan(draft.number(f"{arm}_spread"))
        limits = ~np.isnan(draft.number(f"{arm}_lower") + draft.number(f"{arm}_upper"))
        kinds[blank & spread] = defaults.spread_kind
        bare = blank & ~spread & np.isnan(draft.number(f"{arm}_sd"))
        for row in where(bare & limits):
            kinds[row] = spreads.CI
            yield draft.note(
                levels.FIXED,
                "limits without a kind",
                f"{arm}_lower",
                row,
                f"two limits of the {arm} mean without a kind are taken as a confidence interval",
                f"type the kind in {arm}_spread_kind when they are something else",
            )
        for kind, ends in ((spreads.RANGE, ("min", "max")), (spreads.IQR, ("q1", "q3"))):
            both = ~np.isnan(sum(draft.number(f"{arm}_{end}") for end in ends))
            kinds[bare & ~limits & both] = kind  # these columns say themselves what they hold
        _fill(draft, f"{arm}_centre_kind", defaults.centre_kind)
        _fill(draft, f"{arm}_n_meaning", defaults.n_meaning)
    _fill(draft, "design", defaults.design)


def unusual_meanings(draft: Draft) -> Iterator[Note]:
    """Counts of subsamples as n, and designs with dependent arms."""
    for arm in arms.ARMS:
        yield from each_typed(
            draft,
            levels.ASK,
            "n counts subsamples",
            f"{arm}_n_meaning",
            where(draft.text(f"{arm}_n_meaning") == "subsample"),
            "n counts subsamples; it is used as if it counted replicates until somebody decides",
            "type the number of replicates",
        )
    designs = draft.text("design")
    dependent = [row for row, text in enumerate(designs) if text not in (None, "independent")]
    yield from each_typed(
        draft,
        levels.ASK,
        "design not used",
        "design",
        dependent,
        "the design makes the arms dependent; they count as independent until somebody decides",
        "read the interval of such rows with care",
    )


def each_typed(
    draft: Draft, level: str, rule: str, column: str, rows: Sequence[int], wrong: str, todo: str
) -> Iterator[Note]:
    """One finding for each typed cell; one for all rows together where a default speaks."""
    place = draft.found.get(column)
    typed = [row for row in rows if place is not None and draft.typed(column, row).strip()]
    yield from draft.notes(level, rule, column, typed, wrong, todo)
    rest = tuple(sorted(set(rows) - set(typed)))
    if rest:
        origin = f"{wrong} ({len(rest)} rows, from 'defaults' in the config)"
        yield Note(level, rule, origin, todo, column, leaves=rest)


def _unknown(draft: Draft, name: str, row: int, typed: str, allowed: Iterable[str]) -> Note:
    decides = name in DECIDES_AN_SD
    effect = "this spread counts as missing" if decides else "the cell counts as blank"
    if decides:
        draft.unreadable[name] = draft.was_unreadable(name).copy()
        draft.unreadable[name][row] = True
    hint = _hint(typed[:60], tuple(allowed))
    return draft.note(
        levels.ASK if decides else levels.WARN,
        "unknown word",
        name,
        row,
        f"'{typed[:60]}' is no word of this column, so {effect}: {hint}",
        "type one of: " + ", ".join(allowed),
    )


@lru_cache(maxsize=512)  # the search is slow, and a wrong word often stands in every row
def _hint(typed: str, allowed: tuple[str, ...]) -> str:
    return nearest(typed, allowed)


def _designs(draft: Draft) -> Iterator[Note]:
    designs = draft.text("design")
    for row in where(draft.has_text("design")):
        words = [word.strip() for word in designs[row].split(",")]
        known = [_same_word(word, spreads.DESIGNS) for word in words]
        odd = [word for word, same in zip(words, known, strict=True) if same is None]
        designs[row] = ", ".join(word for word in known if word is not None) or None
        if odd:
            yield _unknown(draft, "design", row, odd[0], spreads.DESIGNS)


def _same_word(typed: str, allowed: Iterable[str]) -> str | None:
    if typed in allowed:
        return typed
    same = [word for word in allowed if typed.casefold() == word.casefold()]
    same = same or [word for word in allowed if plain(typed) == plain(word)]
    return same[0] if len(same) == 1 else None


def _blank(draft: Draft, column: str) -> Mask:
    return ~draft.has_text(column) & ~draft.was_unreadable(column)


def _fill(draft: Draft, column: str, value: str) -> None:
    draft.text(column)[_blank(draft, column)] = value
