"""Warnings that must not be missed: what a reader has to know before using a number."""

from __future__ import annotations

from collections.abc import Iterator

import pandas as pd

from drystone.report import few_studies, numbers
from drystone.report.cautions_averages import average_cautions
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    ReportFacts,
    StrategyFacts,
    main_model,
    main_strategy,
)
from drystone.report.methods_spreads import borrows
from drystone.report.sentences import listed
from drystone.words import levels, scales, strategies

SECOND_ORDER_SHARE = 0.25
GENERAL = (
    "This page is a statistical summary of what was typed into the extraction sheet. It is not "
    "advice, and it recommends no action.",
    "A narrow interval does not make a weak study strong: judge the quality and the relevance of "
    "the studies before leaning on any number here.",
    "Where a decision touches land, animals, health, safety or the law, local rules and qualified "
    "practice come first.",
    "A percent change here is a median ratio: under the model, which is symmetric on the log "
    "scale, half of the true ratios are expected above it. The mean ratio is larger when effects "
    "differ between studies or between rows.",
)
OF_THE_AVERAGE = (
    "No interval here carries the uncertainty of the average CV itself: where a CV is borrowed, it "
    "enters as if it were known."
)


def general_cautions(facts: ReportFacts) -> tuple[str, ...]:
    """Cautions that hold for every number on the page."""
    return (*GENERAL, OF_THE_AVERAGE) if borrows(facts) else GENERAL


def review_cautions(facts: ReportFacts) -> tuple[str, ...]:
    """Warnings about the sheet as a whole."""
    counts = facts.findings["level"].value_counts()
    stops, asks = int(counts.get(levels.STOP, 0)), int(counts.get(levels.ASK, 0))
    found = []
    if stops:
        found.append(
            f"The check found {numbers.count(stops, 'fault')} of level stop; the rows concerned "
            "are in the ledger, not in the results."
        )
    if asks:
        found.append(
            f"{numbers.count(asks, 'question')} {'waits' if asks == 1 else 'wait'} for a person; "
            "until answered, the stated default holds."
        )
    return tuple(found)


def analysis_cautions(facts: ReportFacts, analysis: AnalysisFacts) -> tuple[str, ...]:
    """Warnings about one analysis, each once, the gravest first."""
    strategy = main_strategy(facts, analysis)
    model = main_model(strategy)
    found: list[str] = []
    found += _refusals(analysis)
    found += _few_studies(model)
    found += _complete_cases(facts, analysis)
    found += average_cautions(facts, analysis, strategy)
    found += _second_order(analysis, strategy)
    found += _normality(analysis)
    found += _shared_controls(analysis)
    found += _of_the_fit(model)
    return tuple(dict.fromkeys(found))


def _refusals(analysis: AnalysisFacts) -> Iterator[str]:
    by_reason: dict[tuple[str, str], list[str]] = {}
    for strategy in analysis.strategies:
        for model in strategy.models:
            if model.refused:
                by_reason.setdefault((model.name, model.refused), []).append(strategy.name)
    for (name, reason), where in by_reason.items():
        under = "every strategy" if len(where) == len(analysis.strategies) else listed(where)
        yield f"Model '{name}' was refused under {under}: {reason.rstrip('.')}."


def _few_studies(model: ModelFacts | None) -> Iterator[str]:
    overall = None if model is None else model.overall()
    if overall is not None and (text := few_studies.warning(float(overall["df"]))):
        yield text


def _of_the_fit(model: ModelFacts | None) -> Iterator[str]:
    """Sentences of the fit itself, but for the one on few studies, which the page says alone."""
    for text in () if model is None else model.warnings:
        if not text.startswith(few_studies.OPENING):
            yield text


def _complete_cases(facts: ReportFacts, analysis: AnalysisFacts) -> Iterator[str]:
    rows = len(analysis.slice)
    own = analysis.slice[["control_sd_source", "treatment_sd_source"]] != "none"
    complete = int(own.all(axis=1).sum())
    if rows and complete < rows:
        text = (
            f"{numbers.share(1 - complete / rows)} of usable rows ({rows - complete} of {rows}) "
            f"lack an SD; {strategies.COMPLETE_CASES} would drop them."
        )
        used = {strategy.settings.use for strategy in analysis.strategies}
        if used == {strategies.COMPLETE_CASES}:
            text += " No other strategy was run, so what these rows would change is not known."
        yield text


def _second_order(analysis: AnalysisFacts, main: StrategyFacts) -> Iterator[str]:
    """The share is that of the rows' own CVs, so it says which strategy is concerned."""
    shares = analysis.effects["second_order_share"]
    heavy = analysis.effects.loc[shares > SECOND_ORDER_SHARE, "row_id"]
    if not len(heavy):
        return
    yield (
        f"In {numbers.count(len(heavy), 'row')} the second-order term, with the rows' own CVs, is "
        f"more than a quarter of the sampling variance ({_some(heavy)}): their CVs are large for "
        f"their n. {_own_cvs(analysis, main, heavy)}"
    )


def _own_cvs(analysis: AnalysisFacts, main: StrategyFacts, heavy: pd.Series) -> str:
    if analysis.settings.order != scales.SECOND:
        return "This analysis is first order, so the term is not used."
    used = main.sampling[main.sampling["row_id"].isin(heavy)]
    own = ((used["control_cv_source"] == "own") & (used["treatment_cv_source"] == "own")).sum()
    if own == 0:
        return f"The main strategy ({main.name}) does not use these CVs there."
    where = "there" if own == len(heavy) else f"in {numbers.whole(own)} of them"
    return f"The main strategy ({main.name}) uses these CVs {where}."


def _normality(analysis: AnalysisFacts) -> Iterator[str]:
    failing = analysis.effects.loc[analysis.effects["normal_enough"] == "fail", "row_id"]
    if len(failing):
        verb = "fails" if len(failing) == 1 else "fail"
        yield (
            f"{numbers.count(len(failing), 'row')} {verb} the normal-approximation check "
            f"({_some(failing)}): a mean lies close to zero against its standard error."
        )


def _shared_controls(analysis: AnalysisFacts) -> Iterator[str]:
    if analysis.settings.shared_controls == "ignore":
        yield "Rows that share an arm are treated as independent, as the config declares."


def _some(names: pd.Series, most: int = 5) -> str:
    shown = [str(name) for name in names[:most]]
    more = len(names) - len(shown)
    return ", ".join(shown) + (f" and {more} more" if more else "")
