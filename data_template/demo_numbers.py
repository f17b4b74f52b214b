"""The numbers of the demo: replicate values are drawn, summarised and rounded as papers do it.

Only ``random.Random.random`` is used, whose sequence Python promises to keep, and each study has
its own stream: the sheet is the same on every machine, and a study more changes no other study.
"""

from __future__ import annotations

import math
import random
from collections.abc import Sequence
from dataclasses import dataclass
from statistics import NormalDist, fmean, stdev
from typing import Any, TypeVar

from demo_places import ASPECTS, OUTCOMES, SITES, Outcome, Study
from scipy.special import stdtrit

SEED = "dry-stone walls of the Skarrow Uplands"
TAU_STUDY = 0.15  # SD of the true log response ratio between studies
TAU_ROW = 0.10  # and between the comparisons of one study
MIDDLE_HEIGHT = 1.4  # m; at this wall height the effect is the outcome's mean effect

Row = dict[str, Any]
T = TypeVar("T")


class Draws:
    """Random numbers from a named stream."""

    def __init__(self, name: str) -> None:
        self._stream = random.Random(f"{SEED}: {name}")

    def share(self) -> float:
        """Uniform on (0, 1)."""
        return max(self._stream.random(), 2.0**-53)

    def between(self, low: float, high: float) -> float:
        """Uniform between two numbers."""
        return low + (high - low) * self.share()

    def normal(self, sd: float) -> float:
        """Normal with mean zero."""
        return sd * NormalDist().inv_cdf(self.share())

    def pick(self, options: Sequence[T]) -> T:
        """One of the options, each as likely."""
        return options[int(self.share() * len(options))]

    def order(self, options: Sequence[T]) -> list[T]:
        """Return the options in a random order."""
        return [option for _, option in sorted((self.share(), option) for option in options)]


@dataclass(frozen=True)
class Arm:
    """What a paper prints of one arm, and its SD before rounding."""

    mean: float
    sd: float
    n: int


def rows_of(study: Study) -> list[Row]:
    """Comparisons of one study, without row ids."""
    draws = Draws(study.name)
    return [row for name in study.outcomes for row in _outcome_rows(study, OUTCOMES[name], draws)]


def _outcome_rows(study: Study, outcome: Outcome, draws: Draws) -> list[Row]:
    n = 3 + int(10 * draws.share() ** 1.5)
    kind = _reported_kind(n, draws)
    shift = draws.normal(TAU_STUDY)
    level = math.exp(draws.normal(0.2))
    units = draws.pick((1, 2, 2, 2))
    species = draws.order(list(outcome.species))
    sites = draws.order(SITES)
    place = draws.pick(("Table 1", "Table 2", "Table 3", "Figure 2"))
    rows: list[Row] = []
    for unit in range(units):
        kind_of_plant = species[0 if draws.share() < 0.5 else unit]
        common = {
            "study": study.name,
            "site": sites[unit],
            "species": kind_of_plant,
            "outcome": outcome.name,
            "unit": outcome.unit,
            "date": f"summer {study.year - 2}",
            "control_source_place": place,
            "treatment_source_place": place,
        }
        if place.startswith("Figure"):
            common |= {"control_digitised": "yes", "treatment_digitised": "yes"}
        base = outcome.species[kind_of_plant] * level
        rows += _unit_rows(common, unit + 1, base, shift, n, kind, outcome, draws)
    return rows


def _reported_kind(n: int, draws: Draws) -> str:
    """What spread the study prints; small studies print none more often."""
    silent = 0.55 if n <= 4 else 0.35 if n <= 7 else 0.1
    if draws.share() < silent:
        return "none"
    kind = draws.pick(("SD",) * 11 + ("SE",) * 4 + ("CI", "CI", "CV%", "CV%", "variance"))
    return "SE" if kind == "CI" and n < 5 else kind


def _unit_rows(
    common: Row,
    number: int,
    base: float,
    shift: float,
    n: int,
    kind: str,
    outcome: Outcome,
    draws: Draws,
) -> list[Row]:
    """One open-ground control and the one to three lee strips compared with it."""
    letter = outcome.name[0].upper()
    control = _arm_cells("control", _arm(base, n, outcome, draws), kind, outcome)
    strips = 1 if draws.share() < 0.6 else draws.pick((2, 2, 3))
    aspects = draws.order(ASPECTS)
    rows = []
    for strip in range(strips):
        height = round(draws.between(0.8, 2.1), 1)
        aspect = aspects[strip]
        effect = shift + draws.normal(TAU_ROW) + _expected(outcome, height, aspect)
        cells = _arm_cells(
            "treatment", _arm(base * math.exp(effect), n, outcome, draws), kind, outcome
        )
        if strips == 1 and draws.share() < 0.06:
            cells = _without_spread(cells)
        rows.append(
            common
            | control
            | cells
            | {
                "control_id": f"open-{letter}{number}",
                "treatment_id": f"lee-{letter}{number}{'abc'[strip]}",
                "control_label": "open ground, 60 m or more from any wall",
                "treatment_label": f"lee strip, {aspect} side of a {height} m wall",
                "wall_height_m": height,
                "aspect": aspect,
            }
        )
    return rows


def _expected(outcome: Outcome, height: float, aspect: str) -> float:
    slope = outcome.per_metre * (height - MIDDLE_HEIGHT)
    return outcome.mean_effect + slope + outcome.by_aspect[aspect]


def _arm(mean: float, n: int, outcome: Outcome, draws: Draws) -> Arm:
    """Summary of ``n`` log-normal replicates around ``mean``."""
    log_variance = math.log1p(draws.between(*outcome.cv) ** 2)
    middle = math.log(mean) - log_variance / 2
    values = [math.exp(middle + draws.normal(math.sqrt(log_variance))) for _ in range(n)]
    return Arm(fmean(values), stdev(values), n)


def _arm_cells(arm: str, summary: Arm, kind: str, outcome: Outcome) -> Row:
    """Cells of one arm, the spread as its kind would be printed."""
    places = outcome.decimals
    cells: Row = {f"{arm}_mean": round(summary.mean, places), f"{arm}_n": summary.n}
    se = summary.sd / math.sqrt(summary.n)
    if kind == "SD":
        return cells | {f"{arm}_sd": round(summary.sd, places)}
    if kind == "CI":
        half = float(stdtrit(summary.n - 1, 0.975)) * se
        limits = {
            f"{arm}_lower": round(summary.mean - half, places),
            f"{arm}_upper": round(summary.mean + half, places),
        }
        return cells | limits | {f"{arm}_spread_kind": kind}
    printed = {
        "SE": round(se, places),
        "CV%": round(100 * summary.sd / summary.mean, 1),
        "variance": round(summary.sd**2, places),
    }
    if kind in printed:
        cells |= {f"{arm}_spread": printed[kind], f"{arm}_spread_kind": kind}
    return cells


def _without_spread(cells: Row) -> Row:
    gone = ("_sd", "_spread", "_spread_kind", "_lower", "_upper")
    return {name: value for name, value in cells.items() if not name.endswith(gone)}
