"""The comparisons as bars on one scale: one line for each study, its rows behind it.

The template draws the page from this and `figures` the picture for a paper, so the two cannot
tell different stories.
"""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import pandas as pd
from scipy.special import ndtri

from drystone.report import numbers
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    Record,
    ReportFacts,
    StrategyFacts,
    records,
)
from drystone.report.links import Links
from drystone.report.scale import Bar, RatioScale, Tick, ratio_scale
from drystone.report.study_summary import StudySummary, summarise_studies

LONGEST_WITHOUT_SCROLLING = 25


@dataclass(frozen=True)
class LadderRow:
    """One comparison; ``gappy`` when an arm has no SD of its own or from another row."""

    row_id: str
    anchor: str
    comparison: str
    control: str
    treatment: str
    borrowed: str
    gappy: bool
    derivations: tuple[tuple[str, str], ...]
    where: str
    effect: float
    low: float
    high: float
    text: str
    bar: Bar | None


@dataclass(frozen=True)
class LadderStudy:
    """One study: its own effect and its rows; ``gappy`` when most rows lack an SD."""

    name: str
    year: str
    effect: float
    low: float
    high: float
    text: str
    bar: Bar | None
    gappy: bool
    rows: tuple[LadderRow, ...]


@dataclass(frozen=True)
class Ladder:
    """All studies, largest effect first, with the overall effect behind them.

    ``times`` is how many standard errors the bars of studies and rows reach.
    """

    times: float
    scale: RatioScale
    ticks: tuple[Tick, ...]
    interval: tuple[float, float] | None
    overall: Bar | None
    predicted: Bar | None
    studies: tuple[LadderStudy, ...]
    scrolls: bool

    @property
    def without_bar(self) -> int:
        """Studies whose rows have a covariance that cannot be."""
        return sum(study.bar is None for study in self.studies)


def build_ladder(
    facts: ReportFacts,
    analysis: AnalysisFacts,
    strategy: StrategyFacts,
    model: ModelFacts | None,
    links: Links,
) -> Ladder:
    """Ladder of ``analysis`` as ``strategy`` sees it."""
    overall = None if model is None else model.overall()
    summaries = summarise_studies(strategy.sampling, strategy.covariance, between_rows(model))
    scale = _scale(strategy.sampling, overall)
    times = float(ndtri(0.5 + facts.settings.inference.confidence_percent / 200))
    rows: dict[str, list[LadderRow]] = {}
    for study, row in _rows(analysis, strategy.sampling, scale, times, links):
        rows.setdefault(study, []).append(row)
    years = _years(facts.studies)
    studies = [_study(s, scale, times, rows.get(s.study, []), years) for s in summaries]
    studies.sort(key=lambda study: (math.isnan(study.effect), -study.effect))
    return Ladder(
        times,
        scale,
        scale.ticks(),
        None if overall is None else (float(overall["ci_low"]), float(overall["ci_high"])),
        _overall_bar(scale, overall, "ci"),
        _overall_bar(scale, overall, "pi"),
        tuple(studies),
        len(studies) > LONGEST_WITHOUT_SCROLLING,
    )


def between_rows(model: ModelFacts | None) -> float:
    """Fitted variance between the rows of a study; 0 when there is none."""
    if model is None or model.refused:
        return 0.0
    found = model.components.loc[model.components["level"] == "row", "variance"]
    return float(found.iloc[0]) if len(found) else 0.0


def _scale(sampling: pd.DataFrame, overall: pd.Series | None) -> RatioScale:
    names = ("estimate", "ci_low", "ci_high", "pi_low", "pi_high")
    must = [] if overall is None else [float(overall[name]) for name in names]
    return ratio_scale(sampling["effect"], must)


def _overall_bar(scale: RatioScale, overall: pd.Series | None, kind: str) -> Bar | None:
    if overall is None:
        return None
    return scale.bar(
        *(float(overall[name]) for name in ("estimate", f"{kind}_low", f"{kind}_high"))
    )


def year_beside(name: str, year: str) -> str:
    """Year to print beside a study's name; blank when the name says it already."""
    return "" if year in name else year


def _years(studies: pd.DataFrame) -> dict[str, str]:
    known = studies.dropna(subset=["year"])
    return {
        str(name): f"{year:.0f}" for name, year in zip(known["study"], known["year"], strict=True)
    }


def _study(
    summary: StudySummary,
    scale: RatioScale,
    times: float,
    rows: Sequence[LadderRow],
    years: Mapping[str, str],
) -> LadderStudy:
    low, high = summary.mean - times * summary.se, summary.mean + times * summary.se
    return LadderStudy(
        summary.study,
        year_beside(summary.study, years.get(summary.study, "")),
        summary.mean,
        low,
        high,
        numbers.percent_with_interval(summary.mean, low, high),
        scale.bar(summary.mean, low, high),
        2 * sum(row.gappy for row in rows) > len(rows),
        tuple(rows),
    )


def _rows(
    analysis: AnalysisFacts, sampling: pd.DataFrame, scale: RatioScale, times: float, links: Links
) -> Iterator[tuple[str, LadderRow]]:
    used = {record["row_id"]: record for record in records(sampling)}
    places = links.of(analysis)
    for record in records(analysis.slice):
        row_id = str(record["row_id"])
        if row_id in used:
            derived = tuple(links.derivations.get(row_id, ()))
            yield (
                str(record["study"]),
                _row(record, used[row_id], scale, times, (places.get(row_id, ""), derived)),
            )


def _row(
    record: Record,
    used: Record,
    scale: RatioScale,
    times: float,
    places: tuple[str, tuple[tuple[str, str], ...]],
) -> LadderRow:
    effect, half = float(used["effect"]), times * _root(float(used["sampling_variance"]))
    low, high = effect - half, effect + half
    return LadderRow(
        str(record["row_id"]),
        places[0],
        _comparison(record),
        _arm(record, "control"),
        _arm(record, "treatment"),
        _borrowed(used),
        "none" in (record["control_sd_source"], record["treatment_sd_source"]),
        places[1],
        _where(record),
        effect,
        low,
        high,
        numbers.percent_with_interval(effect, low, high),
        scale.bar(effect, low, high),
    )


def _root(variance: float) -> float:
    """Standard error; NaN, so that no bar is drawn, for a variance that cannot be."""
    return math.sqrt(variance) if variance >= 0 else math.nan


def _where(record: Record) -> str:
    sheet, row = numbers.typed(record["sheet"]), record["sheet_row"]
    parts = [sheet] * bool(sheet) + [f"row {row:.0f}"] * bool(row and row == row)
    return ", ".join(parts)


def _comparison(record: Record) -> str:
    sides = [
        numbers.typed(record[f"{arm}_label"]) or numbers.typed(record[f"{arm}_arm"])
        for arm in ("treatment", "control")
    ]
    return f"{record['outcome']}: {sides[0]} against {sides[1]}"


def _arm(record: Record, arm: str) -> str:
    mean, sd, n = (float(record[f"{arm}_{what}"]) for what in ("mean", "sd", "n"))
    spread = "no SD" if math.isnan(sd) else f"SD {numbers.number(sd)}"
    if record[f"{arm}_sd_source"] == "other row":
        spread += " (from another row)"
    elif record[f"{arm}_sd_pooled"] and not math.isnan(sd):
        spread += " (one for both arms)"
    return f"{numbers.number(mean, 4)}; {spread}; n {numbers.amount(n)}"


def _borrowed(used: Record) -> str:
    arms = [arm for arm in ("control", "treatment") if used[f"{arm}_cv_source"] == "average"]
    return " and ".join(arms)
