"""Tables of the models with moderators: under the main strategy, and over all of them."""

from __future__ import annotations

import math
from collections.abc import Iterator, Sequence

import pandas as pd

from drystone.report import few_studies, numbers, terms
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    Record,
    ReportFacts,
    StrategyFacts,
    number_of,
    records,
)
from drystone.report.tables_shown import Row, Shown, row, shown
from drystone.words import scales

FARTHEST = math.log(1000.0)  # a ratio beyond it is no percent that a reader can use
BEYOND = f"beyond a factor of {numbers.whole(1000)}"
HOW_TO_READ = (
    "A mean is a log ratio, as percent a percent change. A difference between levels or a slope "
    "is a difference of log ratios, as percent it multiplies the ratio."
)
WITH_INTERACTION = (
    "In an interaction, a difference or slope holds where the other moderator is at its reference "
    "or at 0, inside the data or not."
)


def moderator_tables(
    facts: ReportFacts, analysis: AnalysisFacts, main: StrategyFacts
) -> Iterator[Shown]:
    """Two tables for each model with moderators that at least one strategy could fit."""
    for model in main.models:
        if model.is_overall:
            continue
        if not model.refused:
            yield _coefficients(facts, analysis, main, model)
        fitted = {s.name: m for s in analysis.strategies if (m := _fitted(s, model.name))}
        if fitted:
            yield _across(analysis, main, model.name, fitted)


def as_percent(estimate: float, low: float, high: float) -> str:
    """Percent change with limits, or words where an extrapolation makes it absurd."""
    if any(abs(value) > FARTHEST for value in (estimate, low, high)):
        return BEYOND
    return numbers.percent_with_interval(estimate, low, high)


def _fitted(strategy: StrategyFacts, name: str) -> ModelFacts | None:
    model = strategy.model(name)
    return None if model is None or model.refused else model


def _known(
    analysis: AnalysisFacts, strategy: StrategyFacts, model: ModelFacts
) -> list[terms.Moderator]:
    rows = analysis.slice[analysis.slice["row_id"].isin(strategy.sampling["row_id"])]
    return terms.moderators(model.formula, _names(model), rows)


def _names(model: ModelFacts) -> list[str]:
    return [str(name) for name in model.coefficients["coefficient"]]


def _coefficients(
    facts: ReportFacts, analysis: AnalysisFacts, strategy: StrategyFacts, model: ModelFacts
) -> Shown:
    level = numbers.level_percent(facts.settings.inference.confidence_percent)
    two_kinds = facts.settings.inference.interval == scales.CLUSTER_ROBUST
    known, names = _known(analysis, strategy, model), _names(model)
    heads = (
        "Coefficient", "What it is", "#As percent (interval)", "#Log scale", f"#{level} interval",
        "#SE", "#df", "#p", *(["#Model-based interval"] * two_kinds),
    )  # fmt: skip
    rows = [
        _coefficient(item, terms.meaning(str(item["coefficient"]), known, names), two_kinds)
        for item in records(model.coefficients)
    ]
    bent = any(terms.meaning(name, known, names) == terms.INTERACTION for name in names)
    notes = (terms.references(known), HOW_TO_READ, WITH_INTERACTION * bent)
    return shown(_caption(strategy, model, notes), heads, rows)


def _coefficient(item: Record, what: str, two_kinds: bool) -> Row:
    beside = numbers.number_interval(item["ci_low_model"], item["ci_high_model"])
    return row(
        (
            str(item["coefficient"]),
            what,
            as_percent(item["estimate"], item["ci_low"], item["ci_high"]),
            numbers.number(item["estimate"]),
            numbers.number_interval(item["ci_low"], item["ci_high"]),
            numbers.number(item["se"]),
            few_studies.marked(item["df"]),
            numbers.p_value(item["p"]),
            *([beside] * two_kinds),
        )
    )


def _caption(strategy: StrategyFacts, model: ModelFacts, notes: Sequence[str]) -> str:
    first = model.coefficients.iloc[0]
    rows = numbers.count(int(first["rows"]), "row")
    studies = numbers.count(int(first["studies"]), "study", "studies")
    parts = [
        f"Model '{model.name}', {model.formula}, under '{strategy.name}': {rows} of {studies}.",
        *_explained(model),
        *notes,
    ]
    if any(few_studies.is_few(df) for df in model.coefficients["df"]):
        parts.append(few_studies.NOTE)
    return " ".join(part for part in parts if part)


def _explained(model: ModelFacts) -> Iterator[str]:
    for item in records(model.heterogeneity):
        marginal, conditional = (
            numbers.share(item[f"r2_{which}"]) for which in ("marginal", "conditional")
        )
        yield f"R² marginal {marginal}, conditional {conditional}."


def _across(
    analysis: AnalysisFacts, main: StrategyFacts, name: str, fitted: dict[str, ModelFacts]
) -> Shown:
    """One line for each coefficient; a cell says so where a strategy's rows change its meaning."""
    strategies = [strategy.name for strategy in analysis.strategies]
    leading = main.name if main.name in fitted else next(iter(fitted))
    meanings = {s: _meanings(analysis, s, model) for s, model in fitted.items()}
    wanted = list(dict.fromkeys(n for s in (leading, *fitted) for n in meanings[s]))
    rows = []
    for coefficient in wanted:
        usual = next(
            meanings[s][coefficient] for s in (leading, *fitted) if coefficient in meanings[s]
        )
        cells = (
            _cell(fitted.get(s), coefficient, meanings.get(s, {}).get(coefficient, usual), usual)
            for s in strategies
        )
        rows.append(row((coefficient, usual, *cells)))
    return shown(
        f"Model '{name}' over the strategies, as percent",
        ("Coefficient", "What it is", *(f"#{s}" for s in strategies)),
        rows,
    )


def _meanings(analysis: AnalysisFacts, strategy: str, model: ModelFacts) -> dict[str, str]:
    found = analysis.strategy(strategy)
    if found is None:
        return {}
    known, names = _known(analysis, found, model), _names(model)
    return {name: terms.meaning(name, known, names) for name in names}


def _cell(model: ModelFacts | None, coefficient: str, here: str, usual: str) -> str:
    if model is None:
        return "refused"
    found = model.coefficients[model.coefficients["coefficient"] == coefficient]
    if not len(found):
        return ""
    text = _short(found.iloc[0])
    return text if here == usual else f"{text}; here: {here}"


def _short(item: pd.Series) -> str:
    middle, low, high = (number_of(item, name) for name in ("estimate", "ci_low", "ci_high"))
    text = as_percent(middle, low, high)
    if text != BEYOND:
        return text
    return f"{BEYOND}; log scale {numbers.number(middle)} ({numbers.number_interval(low, high)})"
