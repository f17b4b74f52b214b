"""Warnings on the first screen: each only where it is true, with its number. Invented facts."""

from __future__ import annotations

from dataclasses import replace

import pandas as pd
import pytest
from report.invented_facts import invented_facts
from test_report_numbers import plain

from drystone.report import cautions, few_studies
from drystone.report.facts import AnalysisFacts, ReportFacts, StrategyFacts

MAIN, MISSING = "all cases", "missing cases"


def said(facts: ReportFacts, analysis: AnalysisFacts) -> str:
    return plain(" ".join(cautions.analysis_cautions(facts, analysis)))


def changed(analysis: AnalysisFacts, name: str, **parts: object) -> AnalysisFacts:
    """Analysis with parts of one strategy replaced."""
    made = (replace(s, **parts) if s.name == name else s for s in analysis.strategies)
    return replace(analysis, strategies=tuple(made))


def strategy(analysis: AnalysisFacts, name: str) -> StrategyFacts:
    found = analysis.strategy(name)
    assert found is not None
    return found


def with_df(analysis: AnalysisFacts, df: float, warnings: str | None = None) -> AnalysisFacts:
    """Analysis whose overall effect under the main strategy has ``df`` degrees of freedom."""
    first, *rest = strategy(analysis, MAIN).models
    table = first.coefficients.assign(df=df, warnings=warnings)
    return changed(analysis, MAIN, models=(replace(first, coefficients=table), *rest))


def test_warnings_that_must_not_be_missed() -> None:
    facts = invented_facts(12)
    text = plain(" ".join(cautions.analysis_cautions(facts, facts.analyses[0])))
    assert "Model 'path and age' was refused under complete cases" in text
    assert "complete cases would drop them" in text
    assert "Too few studies" in text
    assert "12 arms" not in text


def test_enough_studies_bring_no_warning() -> None:
    facts = invented_facts(130)
    assert "Too few studies" not in " ".join(cautions.analysis_cautions(facts, facts.analyses[0]))


def test_few_reporting_arms_do_not_dominate() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    fewer = tuple(
        replace(strategy, averages=strategy.averages.assign(reporting_arms=9))
        for strategy in analysis.strategies
    )
    found = cautions.analysis_cautions(facts, replace(analysis, strategies=fewer))
    assert not any("owns" in text for text in found)


def test_heavy_second_order_term_is_named() -> None:
    facts = invented_facts(12)
    analysis = facts.analyses[0]
    effects = analysis.effects.assign(second_order_share=0.1)
    effects.loc[3, "second_order_share"] = 0.3
    found = cautions.analysis_cautions(facts, replace(analysis, effects=effects))
    [text] = [text for text in found if "second-order" in text]
    assert "beetles-0004" in text
    assert "1 row" in plain(text)


def test_a_dominating_arm_is_named_with_strategies_and_reading() -> None:
    facts = invented_facts(130)
    text = said(facts, facts.analyses[0])
    # the invented averages: CV^2 .061 in the reading used, .097 in the other; no median there
    assert (
        "One arm owns 31 % of the average CV of control arms (beetle number) under all cases and "
        "missing cases (reading: square of mean): beetles-0003 | control. Ways out: mend this arm "
        "in the sheet if it is wrong; see in the table of averages under Why what the other "
        "versions give; or average over both arms (average_over: both arms), which gives up the "
        "difference between them."
    ) in text
    assert "leave out" not in text
    assert "trim" not in text


def test_the_median_stands_beside_a_dominated_average() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    table = strategy(analysis, MAIN).averages
    median = table.iloc[[0]].assign(version="square of median", cv2=0.04, used=False)
    both = pd.concat([table, median], ignore_index=True)
    text = said(facts, changed(analysis, MAIN, averages=both))
    # root of .04 and of .061
    assert "the median, which no arm owns (CV 0.200 instead of 0.247)" in text


def test_an_average_over_both_arms_offers_no_average_over_both_arms() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    for name in (MAIN, MISSING):
        averages = strategy(analysis, name).averages.assign(arm="both")
        analysis = changed(analysis, name, averages=averages)
    text = said(facts, analysis)
    assert "One arm owns 31 % of the average CV of control and treatment arms together" in text
    assert "average_over" not in text


def test_a_reading_that_is_not_used_dominates_nothing() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    for item in analysis.strategies:
        table = item.averages
        shares = table["largest_share"].where(~table["used"].astype(bool), 0.1)
        analysis = changed(analysis, item.name, averages=table.assign(largest_share=shares))
    assert "One arm owns" not in said(facts, analysis)


def test_an_average_on_few_arms_is_said_with_the_number() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    table = strategy(analysis, MAIN).averages
    few = table.assign(reporting_arms=table["reporting_arms"].where(table["arm"] == "control", 7))
    text = said(facts, changed(analysis, MAIN, averages=few))
    assert (
        "The average CV of treatment arms (beetle number), which all cases uses, rests on 7 arms "
        "that report an SD, fewer than ten" in text
    )
    assert "control arms (beetle number), which" not in text


def test_few_arms_of_another_strategy_or_of_no_borrowing_arm_are_silent() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    few = strategy(analysis, MISSING).averages.assign(reporting_arms=7)
    assert "rests on 7 arms" not in said(facts, changed(analysis, MISSING, averages=few))
    sampling = strategy(analysis, MAIN).sampling.assign(treatment_cv_source="own")
    text = said(facts, changed(analysis, MAIN, averages=few, sampling=sampling))
    assert "The average CV of control arms" in text
    assert "The average CV of treatment arms" not in text


def test_an_arm_in_both_roles_may_borrow_under_either() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    rows = analysis.slice.copy()
    rows.loc[5, "treatment_arm"] = rows.loc[6, "control_arm"]
    main = strategy(analysis, MAIN)
    sampling = main.sampling.assign(treatment_cv_source="own")
    few = main.averages.assign(reporting_arms=7)
    chained = replace(
        changed(analysis, MAIN, averages=few, sampling=sampling),
        slice=rows,
    )
    assert "The average CV of treatment arms" in said(facts, chained)


@pytest.mark.parametrize(
    ("strategy_name", "part"),
    [
        (MAIN, "The main strategy (all cases) does not use these CVs there."),
        (MISSING, "The main strategy (missing cases) uses these CVs there."),
    ],
)
def test_second_order_term_says_whose_cvs(strategy_name: str, part: str) -> None:
    facts = invented_facts(12)
    facts = replace(facts, settings=facts.settings.model_copy(update={"primary": strategy_name}))
    analysis = facts.analyses[0]
    both = analysis.effects["variance_second"].notna()
    effects = analysis.effects.assign(second_order_share=0.1)
    effects.loc[both.idxmax(), "second_order_share"] = 0.3
    text = said(facts, replace(analysis, effects=effects))
    assert "In 1 row the second-order term, with the rows' own CVs, is more than a quarter" in text
    assert part in text


def test_second_order_term_of_a_first_order_analysis_is_not_used() -> None:
    facts = invented_facts(12)
    analysis = facts.analyses[1]
    assert analysis.settings.order == "first"
    effects = analysis.effects.assign(second_order_share=0.3)
    assert "first order, so the term is not used" in said(facts, replace(analysis, effects=effects))


def test_too_few_studies_is_said_once_and_below_the_limit() -> None:
    facts = invented_facts(130)
    fit_says = "Too few studies for a firm interval: 4.0 degrees of freedom\nSomething else."
    text = said(facts, with_df(facts.analyses[0], 3.98, fit_says))
    assert text.count("Too few studies") == 1
    assert "rests on 3.98 degrees of freedom. Below 4" in text
    assert "Something else." in text


@pytest.mark.parametrize(
    ("df", "text"),
    [(3.98, "3.98 (below 4)"), (3.9996, "3.9996 (below 4)"), (4.0, "4.00"), (27.54, "27.5")],
)
def test_degrees_of_freedom_are_marked(df: float, text: str) -> None:
    assert few_studies.marked(df) == text


def test_the_average_is_known_to_no_interval_where_one_is_borrowed() -> None:
    facts = invented_facts(12)
    assert "uncertainty of the average CV itself" in " ".join(cautions.general_cautions(facts))
    only = tuple(s for s in facts.settings.strategies if s.use == "complete cases")
    bare = replace(facts, settings=facts.settings.model_copy(update={"strategies": only}))
    assert "average CV" not in " ".join(cautions.general_cautions(bare))
    median = next(text for text in cautions.GENERAL if "median ratio" in text)
    assert "under the model, which is symmetric on the log scale" in median
    assert median.endswith("differ between studies or between rows.")
