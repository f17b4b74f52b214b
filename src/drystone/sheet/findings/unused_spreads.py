"""Spreads that are typed but become no SD, where the arm has none."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, Mask, where
from drystone.sheet.findings.own_spreads import NO_SD
from drystone.sheet.notes import Note
from drystone.words import arms, levels, spreads


def unused_spreads(draft: Draft) -> Iterator[Note]:
    """Unlabelled spreads, lonely limits and quartiles, spreads of both arms without a kind."""
    without = {arm: np.isnan(draft.sds[arm]) for arm in arms.ARMS}
    for arm in arms.ARMS:
        yield from _lonely_limit(draft, arm, without[arm])
        yield from _unlabelled(draft, arm, without[arm])
        yield from _quantiles(draft, arm, without[arm])
    either = without[arms.CONTROL] | without[arms.TREATMENT]
    for column, kind in (("pooled_spread", "pooled_kind"), ("test_value", "test_kind")):
        blank = ~draft.has_text(kind) & ~draft.was_unreadable(kind)
        yield from draft.notes(
            levels.ASK,
            "spread not converted",
            column,
            where(either & blank & ~np.isnan(draft.number(column))),
            f"{column} has no {kind}, so nothing says what it is; {NO_SD}",
            f"choose {kind}",
        )


def _unlabelled(draft: Draft, arm: str, without: Mask) -> Iterator[Note]:
    spread, n = draft.number(f"{arm}_spread"), draft.number(f"{arm}_n")
    kinds = draft.text(f"{arm}_spread_kind")
    yield from draft.notes(
        levels.ASK,
        "spread not converted",
        f"{arm}_spread",
        where(without & (kinds == spreads.UNLABELLED) & (spread > 0) & ~np.isnan(n)),
        lambda row: (
            f"nothing says what this spread is: taken as an SD it is {spread[row]:.6g}, as an SE "
            f"the SD would be {spread[row] * np.sqrt(max(n[row], 0.0)):.6g}; {NO_SD}"
        ),
        "look for the legend or the methods, and choose its kind; ask the authors",
    )


def _quantiles(draft: Draft, arm: str, without: Mask) -> Iterator[Note]:
    kinds = draft.text(f"{arm}_spread_kind")
    asked = np.asarray(draft.text(f"{arm}_centre_kind") == spreads.GEOMETRIC_MEAN)
    asked |= draft.number(f"{arm}_n") < 2
    quantile_kind = np.isin(kinds, (spreads.IQR, spreads.RANGE))
    for first, second in (("q1", "q3"), ("min", "max")):
        one, two = (~np.isnan(draft.number(f"{arm}_{end}")) for end in (first, second))
        for end, alone in ((first, one & ~two), (second, two & ~one)):
            yield from draft.notes(
                levels.ASK,
                "spread not converted",
                f"{arm}_{end}",
                where(without & alone & ~asked),
                f"{end} stands without its other end, so the width is not known; {NO_SD}",
                f"type both {first} and {second}",
            )
        yield from draft.notes(
            levels.ASK,
            "spread not converted",
            f"{arm}_{first}",
            where(without & one & two & ~quantile_kind & ~asked),
            f"{first} and {second} are not used, since {arm}_spread_kind names another kind; "
            f"{NO_SD}",
            f"choose the kind {spreads.IQR} or {spreads.RANGE}",
        )


def _lonely_limit(draft: Draft, arm: str, without: Mask) -> Iterator[Note]:
    given = {end: ~np.isnan(draft.number(f"{arm}_{end}")) for end in ("lower", "upper")}
    for end, other in (("lower", "upper"), ("upper", "lower")):
        yield from draft.notes(
            levels.ASK,
            "one limit only",
            f"{arm}_{end}",
            where(without & given[end] & ~given[other]),
            f"the {other} limit is missing, so the interval's width is not known; {NO_SD}",
            "type both limits",
        )
