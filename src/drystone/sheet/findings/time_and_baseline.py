"""Several dates of one comparison, means before the treatment, spreads without a kind."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, where
from drystone.sheet.findings.groups import open_rows
from drystone.sheet.notes import Note
from drystone.words import arms, levels


def repeated_dates(draft: Draft) -> Iterator[Note]:
    """Ask once for each outcome whose named arms were compared at several dates."""
    dates: dict[tuple[object, ...], dict[str, int]] = defaultdict(dict)
    names = [draft.text(name) for name in ("outcome", "study", "control_id", "treatment_id")]
    for row in open_rows(draft):
        key, date = tuple(name[row] for name in names), draft.text("date")[row]
        if None not in key and date is not None:
            dates[key].setdefault(date, row)
    told: set[object] = set()
    for key, rows in dates.items():
        if len(rows) > 1 and key[0] not in told:
            told.add(key[0])
            row = list(rows.values())[1]
            yield draft.note(
                levels.ASK,
                "several dates",
                "date",
                row,
                f"'{key[3]}' against '{key[2]}' of '{key[1]}' stands at {len(rows)} dates; every "
                "date counts as a row of its own, without correlation in time, until somebody "
                "decides",
                "decide for the outcome: the last date, a mean, or all of them",
            )


def unused_baselines(draft: Draft) -> Iterator[Note]:
    """Ask about means before the treatment, which no effect uses yet."""
    given = ~np.isnan(draft.number("control_baseline_mean"))
    given |= ~np.isnan(draft.number("treatment_baseline_mean"))
    rows = [row for row in open_rows(draft) if given[row]]
    yield from draft.notes(
        levels.ASK,
        "baseline not used",
        "control_baseline_mean",
        rows,
        "means before the treatment are given; the effect compares the later means alone until "
        "somebody decides",
        "see whether the arms differed before; if so, leave the row out with exclude_reason",
    )


def spreads_without_kind(draft: Draft) -> Iterator[Note]:
    """Ask about spreads whose kind is blank while nobody has said what that means."""
    if "spread_kind" in draft.settings.defaults.model_fields_set:
        return
    for arm in arms.ARMS:
        column = f"{arm}_spread_kind"
        blank = ~draft.has_text(column) & ~draft.was_unreadable(column)
        alone = blank & ~np.isnan(draft.number(f"{arm}_spread"))
        rows = where(alone & np.isnan(draft.number(f"{arm}_sd")))
        yield from draft.notes(
            levels.ASK,
            "spread without a kind",
            f"{arm}_spread",
            rows,
            f"nothing says what the spread is; it is taken as {draft.settings.defaults.spread_kind}"
            " until somebody decides",
            f"type SD, SE, CI ... in {column}, or set defaults: spread_kind in the config",
        )
