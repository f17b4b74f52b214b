"""SDs and means that no values can have: beyond the ends of the scale, or not of whole numbers."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from drystone.maths.possible_spread import (
    MOST_VALUES,
    largest_sd,
    squares_behind,
    sums_behind,
)
from drystone.sheet.draft import Draft
from drystone.sheet.findings.groups import outcome_rows
from drystone.sheet.findings.meanings import units_of, upper_end
from drystone.sheet.notes import Note
from drystone.sheet.rounding import half_unit
from drystone.words import arms, levels, meanings, scales

INTERVAL, COUNT = scales.SCALES[1], scales.SCALES[3]
USED = "it is used as typed until somebody decides"


def impossible_sds(draft: Draft) -> Iterator[Note]:
    """Ask about SDs above the largest that values between the ends of the scale can have."""
    for name, rows in outcome_rows(draft).items():
        if draft.settings.outcomes[name].scale == INTERVAL:
            continue
        end = upper_end(draft, name, rows)
        for arm in arms.ARMS:
            mean, n, sd = draft.number(f"{arm}_mean"), draft.number(f"{arm}_n"), draft.sds[arm]
            at = np.array(rows)
            reach = largest_sd(mean[at], n[at], 0.0, math.inf if end is None else end)
            for row in at[(sd[at] > reach) & (mean[at] > 0) & (n[at] >= 2)].tolist():
                most = _most(float(mean[row]), float(n[row]), math.inf if end is None else end)
                if sd[row] - half_unit(float(f"{sd[row]:.6g}")) > most:
                    yield _impossible(draft, arm, row, float(sd[row]), most, end)


def _most(mean: float, n: float, end: float) -> float:
    """Largest SD, for the mean within its rounding that allows most."""
    room = half_unit(mean)
    if math.isinf(end):
        return float(largest_sd(mean + room, n, 0.0, end))
    means = np.clip([mean - room, mean + room, end / 2], max(mean - room, 0.0), mean + room)
    return float(np.nanmax(largest_sd(np.minimum(means, end), n, 0.0, end), initial=0.0))


def _impossible(
    draft: Draft, arm: str, row: int, sd: float, most: float, end: float | None
) -> Note:
    scale = "of zero or more" if end is None else f"between 0 and {end:g}"
    typed = not np.isnan(draft.number(f"{arm}_sd")[row])
    return draft.note(
        levels.ASK,
        "SD above the possible",
        f"{arm}_sd" if typed else f"{arm}_spread",
        row,
        f"the SD {sd:.4g} cannot be: with this mean and n, values {scale} have an SD of "
        f"{most:.4g} at most; {USED}",
        "look for a slip in mean, SD or n, or a spread of another kind",
    )


def whole_numbers(draft: Draft) -> Iterator[Note]:
    """Warn of means and SDs that no whole numbers give, where the values are counts.

    The test holds only when n counts the values behind the mean, so it speaks where the outcome
    is declared a count, or where its unit says so and somebody has said what n counts.
    """
    for name, rows in outcome_rows(draft).items():
        units = units_of(draft, name, rows)
        declared = draft.settings.outcomes[name].scale == COUNT
        if not declared and not any(
            meanings.WHOLE.fullmatch(meanings.readable(unit)) for unit in units
        ):
            continue
        for arm in arms.ARMS:
            for row in rows:
                if declared or _n_explained(draft, arm, row):
                    yield from _not_whole(draft, arm, row)


def _n_explained(draft: Draft, arm: str, row: int) -> bool:
    default = "n_meaning" in draft.settings.defaults.model_fields_set
    return default or bool(draft.typed(f"{arm}_n_meaning", row).strip())


def _not_whole(draft: Draft, arm: str, row: int) -> Iterator[Note]:
    mean, n = float(draft.number(f"{arm}_mean")[row]), float(draft.number(f"{arm}_n")[row])
    if not (0 < mean < 1e6 and 2 <= n <= MOST_VALUES and n == int(n)):
        return
    if 2 * half_unit(mean) * n >= 1:
        return  # every printed mean is possible
    todo = "look for a slip in mean, SD or n; means of means need not fit"
    if not sums_behind(mean, half_unit(mean), int(n)):
        wrong = f"no {n:g} whole numbers have the mean {mean:g}"
        yield draft.note(levels.WARN, "mean not of counts", f"{arm}_mean", row, wrong, todo)
        return
    sd = float(draft.number(f"{arm}_sd")[row])
    if 0 < sd < 1e6 and not squares_behind(mean, half_unit(mean), sd, half_unit(sd), int(n)):
        wrong = f"no {n:g} whole numbers have the mean {mean:g} and the SD {sd:g}"
        yield draft.note(levels.WARN, "SD not of counts", f"{arm}_sd", row, wrong, todo)
