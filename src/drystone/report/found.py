"""First screen: what was found, from how many rows, and whether it holds."""

from __future__ import annotations

from dataclasses import dataclass
from functools import partial

import pandas as pd

from drystone.report import few_studies, numbers, sentences
from drystone.report.cautions import analysis_cautions
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    ReportFacts,
    StrategyFacts,
    main_model,
    main_strategy,
    number_of,
)
from drystone.report.flow import RowFlow, row_flow
from drystone.report.scale import Bar, Tick, ratio_scale
from drystone.report.verdict import Verdict, estimates_of, verdict


@dataclass(frozen=True)
class Picture:
    """Interval and prediction interval on their scale."""

    ticks: tuple[Tick, ...]
    zero: float
    interval: Bar | None
    predicted: Bar | None


@dataclass(frozen=True)
class Found:
    """First screen of one analysis."""

    question: str
    meaning: str
    change: str
    interval: str
    direction: str
    prediction: str
    picture: Picture | None
    basis: str
    no_result: str
    flow: RowFlow
    verdict: Verdict
    cautions: tuple[str, ...]


def found(facts: ReportFacts, analysis: AnalysisFacts) -> Found:
    """First screen of ``analysis`` under the main strategy."""
    strategy = main_strategy(facts, analysis)
    model = main_model(strategy)
    overall = None if model is None else model.overall()
    level = facts.settings.inference.confidence_percent
    get = partial(number_of, overall)
    ends = get("ci_low"), get("ci_high")
    return Found(
        _question(facts, analysis),
        sentences.ratio_meaning(int(analysis.slice["flip"].sum()), len(analysis.slice)),
        numbers.percent(get("estimate")),
        f"{numbers.level_percent(level)} interval {numbers.percent_interval(*ends)} %",
        sentences.direction(get("estimate"), *ends, level),
        sentences.prediction(get("pi_low"), get("pi_high"), level),
        _picture(overall),
        _basis(facts, strategy, overall),
        _no_result(model, strategy),
        row_flow(facts, analysis, strategy),
        _verdict(facts, analysis, model),
        analysis_cautions(facts, analysis),
    )


def _question(facts: ReportFacts, analysis: AnalysisFacts) -> str:
    names = []
    for name in analysis.settings.outcome:
        outcome = facts.settings.outcomes.get(name)
        unit = outcome.unit if outcome is not None else None
        names.append(f"{name} ({unit})" if unit else name)
    kept = sentences.filters(analysis.settings.where, analysis.settings.where_not)
    text = f"{sentences.listed(names)}, treatment against control."
    return f"{text[:1].upper()}{text[1:]} {kept}".rstrip()


def _picture(overall: pd.Series | None) -> Picture | None:
    if overall is None:
        return None
    names = ("ci_low", "ci_high", "pi_low", "pi_high")
    scale = ratio_scale([], [float(overall[name]) for name in names])
    get = partial(number_of, overall)
    return Picture(
        scale.ticks(),
        scale.at(0.0),
        scale.bar(get("estimate"), get("ci_low"), get("ci_high")),
        scale.bar(get("estimate"), get("pi_low"), get("pi_high")),
    )


def _basis(facts: ReportFacts, strategy: StrategyFacts, overall: pd.Series | None) -> str:
    if overall is None:
        return f"Strategy: {strategy.name}."
    rows = numbers.count(int(overall["rows"]), "row")
    studies = numbers.count(int(overall["studies"]), "study", "studies")
    kind = facts.settings.inference.interval.replace(" ", "-")
    return (
        f"From {rows} of {studies}. Missing spreads: {strategy.name} "
        f"({sentences.strategy_gloss(strategy.settings)}). Interval: {kind}, "
        f"{few_studies.marked(float(overall['df']))} degrees of freedom."
    )


def _no_result(model: ModelFacts | None, strategy: StrategyFacts) -> str:
    if model is None:
        return "The config holds no model without moderators, so there is no overall effect here."
    if model.refused:
        return f"No overall effect under {strategy.name}: {model.refused.rstrip('.')}."
    return "" if model.overall() is not None else "The overall model gave no overall effect."


def _verdict(facts: ReportFacts, analysis: AnalysisFacts, model: ModelFacts | None) -> Verdict:
    table = analysis.side_by_side
    name = model.name if model is not None else ""
    declared = [strategy.name for strategy in facts.settings.strategies]
    return verdict(
        estimates_of(table[table["model"] == name], declared),
        facts.settings.inference.confidence_percent,
    )
