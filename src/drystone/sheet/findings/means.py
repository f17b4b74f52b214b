"""Means that no log response ratio can be made of."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, where
from drystone.sheet.notes import Note
from drystone.words import arms, levels, spreads


def check_means(draft: Draft) -> Iterator[Note]:
    """Missing, zero and negative means of both arms."""
    for arm in arms.ARMS:
        column = f"{arm}_mean"
        means = draft.number(column)
        # logarithms may be zero or negative; their antilogs are checked where they are taken
        raw = ~np.isin(draft.text(f"{arm}_centre_kind"), spreads.LOG_CENTRES)
        yield from draft.notes(
            levels.STOP,
            "missing mean",
            column,
            where(np.isnan(means) & ~draft.was_unreadable(column)),
            f"the {arm} arm has no mean",
            "type the mean, or say in exclude_reason why it cannot be had",
        )
        yield from draft.notes(
            levels.STOP,
            "zero mean",
            column,
            where(raw & (means == 0)),
            f"the {arm} mean is zero, and a ratio with it has no logarithm",
            "check the paper (a detection limit?); nothing is added to zeros",
        )
        yield from draft.notes(
            levels.STOP,
            "negative mean",
            column,
            where(raw & (means < 0)),
            f"the {arm} mean is negative, so the outcome has no true zero; both means negative "
            "is not a rescue",
            "check the paper: a change or an index is no outcome for a ratio",
        )
