"""Ratios far from those of their outcome, and those that look like a slip of the unit."""

from __future__ import annotations

import math
from collections.abc import Iterator

import numpy as np

from drystone.maths.spread_screen import reference
from drystone.sheet.draft import Draft, Floats
from drystone.sheet.findings.groups import log_ratios, outcome_rows
from drystone.sheet.findings.meanings import stopped_outcomes
from drystone.sheet.notes import Note
from drystone.words import levels

FEWEST = 10
FAR = 5.0  # robust SDs; common practice takes 3 to 5, no source
FOLD = math.log(5.0)  # requirements: |lnRR| > ln 5
LEAST_SCALE = 0.1
TENFOLD = math.log(10.0)
NEAR = 0.25  # of ln 10, 100 or 1000


def far_ratios(draft: Draft) -> Iterator[Note]:
    """Warn of ratios far out within their outcome, and not shared by the rest of their study."""
    effects = log_ratios(draft)
    stopped = stopped_outcomes(draft)
    for name, rows in outcome_rows(draft).items():
        known = [row for row in rows if not np.isnan(effects[row])]
        if name in stopped or len(known) < FEWEST:
            continue
        studies = np.unique([str(draft.text("study")[row]) for row in known], return_inverse=True)
        yield from _far(draft, name, known, effects[known], studies[1])


def _far(
    draft: Draft, name: str, rows: list[int], effects: Floats, studies: np.ndarray
) -> Iterator[Note]:
    found = reference(effects, np.zeros(len(rows)), studies, LEAST_SCALE, FEWEST - 1)
    away = effects - found.location
    for place in np.flatnonzero((np.abs(away) > FAR * found.scale) & (np.abs(away) > FOLD)):
        scale = _with_tails(np.delete(away, place), float(found.scale[place]))
        others = effects[(studies == studies[place]) & (np.arange(len(rows)) != place)]
        same_study = others.size and abs(effects[place] - np.median(others)) < FOLD
        if same_study or abs(away[place]) < FAR * scale:
            continue
        typical = math.exp(float(found.location[place]))
        slip = _slip(float(away[place]), scale)
        rule = "ratio near a power of ten" if slip else "ratio far out"
        yield draft.note(
            levels.WARN,
            rule,
            "treatment_mean",
            rows[place],
            f"treatment over control is {_short(effects[place])}, while {typical:.3g} is typical "
            f"of '{name}'{slip}",
            "compare the unit and the decimal point of both means with the paper",
        )


def _with_tails(away: Floats, scale: float) -> float:
    """Scale that also covers nine in ten of the others, for outcomes with heavy tails."""
    return max(scale, float(np.quantile(np.abs(away), 0.9)) / 1.6449)


def _short(log_ratio: float) -> str:
    return f"{math.exp(min(max(float(log_ratio), -700.0), 700.0)):.3g}"


def _slip(away: float, scale: float) -> str:
    power = round(abs(away) / TENFOLD)
    room = max(NEAR, 2 * scale)
    if room > TENFOLD / 3:  # powers of ten cannot be told from what lies between
        return ""
    if 1 <= power <= 3 and abs(abs(away) - power * TENFOLD) < room:
        return f"; a factor of {10**power} would bring it back, as when units were mixed"
    return ""
