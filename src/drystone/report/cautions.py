"""Warnings that must not be missed: what a reader has to know before using a number."""

from __future__ import annotations

from collections.abc import Iterator

import pandas as pd

from drystone.maths.average_variation import (
    DOMINATING_SHARE,
    FEWEST_ARMS,
    SPREAD_OF_VERSIONS,
)
from drystone.report import numbers
from drystone.report.facts import (
    AnalysisFacts,
    ModelFacts,
    ReportFacts,
    StrategyFacts,
    main_model,
    main_strategy,
    records,
)
from drystone.report.sentences import listed
from drystone.words import levels, strategies

FEWEST_DF = 4.0  # Tipton 2015, Psych Methods 20:375: below it the t reference is not to be trusted
SECOND_ORDER_SHARE = 0.25


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
    found += _few_studies(facts, model)
    found += _complete_cases(facts, analysis)
    found += _dominating_arms(analysis)
    found += _versions_apart(strategy)
    found += _second_order(analysis)
    found += _normality(analysis)
    found += _shared_controls(analysis)
    found += model.warnings if model is not None else ()
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


def _few_studies(facts: ReportFacts, model: ModelFacts | None) -> Iterator[str]:
    overall = None if model is None else model.overall()
    if overall is not None and overall["df"] < FEWEST_DF:
        yield (
            f"Too few studies: the interval of the overall effect rests on "
            f"{numbers.number(overall['df'], 2)} degrees of freedom. Below "
            f"{FEWEST_DF:g} its coverage cannot be trusted."
        )


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


def _dominating_arms(analysis: AnalysisFacts) -> Iterator[str]:
    seen = set()
    for strategy in analysis.strategies:
        for row in records(_used(strategy)):
            heavy = row["largest_share"] > DOMINATING_SHARE
            key = row["outcome"], row["arm"], row["largest_arm"]
            if heavy and row["reporting_arms"] >= FEWEST_ARMS and key not in seen:
                seen.add(key)
                yield (
                    f"One arm owns {numbers.share(row['largest_share'])} of the average CV "
                    f"({row['outcome']}, {row['arm']}): {numbers.typed(row['largest_arm'])}. "
                    "Ways out: leave out arms that fail the normal-approximation check, trim, "
                    "or average over both arms; compare the versions in the table of averages."
                )


def _versions_apart(strategy: StrategyFacts) -> Iterator[str]:
    factors = {}
    for (outcome, arm), part in strategy.averages.groupby(["outcome", "arm"], sort=False):
        low, high = float(part["cv2"].min()), float(part["cv2"].max())
        if low > 0 and high / low > SPREAD_OF_VERSIONS:
            factors[f"{outcome}, {arm}"] = high / low
    if factors:
        where = "; ".join(f"{key}: {numbers.number(x, 2)}" for key, x in factors.items())
        yield (
            f"Versions of the average squared CV differ by more than a factor of "
            f"{SPREAD_OF_VERSIONS:g} ({where}), so the reading of the average matters; they stand "
            "side by side under Why."
        )


def _second_order(analysis: AnalysisFacts) -> Iterator[str]:
    shares = analysis.effects["second_order_share"]
    heavy = analysis.effects.loc[shares > SECOND_ORDER_SHARE, "row_id"]
    if len(heavy):
        yield (
            f"In {numbers.count(len(heavy), 'row')} the second-order term is more than a quarter "
            f"of the sampling variance ({_some(heavy)}): their CVs are large for their n."
        )


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


def _used(strategy: StrategyFacts) -> pd.DataFrame:
    return strategy.averages[strategy.averages["used"].astype(bool)]


def _some(names: pd.Series, most: int = 5) -> str:
    shown = [str(name) for name in names[:most]]
    more = len(names) - len(shown)
    return ", ".join(shown) + (f" and {more} more" if more else "")
