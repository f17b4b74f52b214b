"""The methods in words, written from the settings of the run: what was done, nothing more."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from drystone.maths.average_variation import GEARY_LIMIT
from drystone.report import numbers
from drystone.report.facts import AnalysisFacts, ReportFacts
from drystone.report.methods_model import heterogeneity, intervals, model_words, shared_arms
from drystone.report.methods_spreads import (
    average_words,
    main_strategy_words,
    spreads,
    strategy_words,
)
from drystone.report.sentences import filters, listed
from drystone.words import scales

PERSON = "A person must write this"


@dataclass(frozen=True)
class Paragraph:
    """One piece of the methods; ``person`` marks what only people can know."""

    heading: str
    text: str
    person: bool = False


def methods(facts: ReportFacts) -> tuple[Paragraph, ...]:
    """Methods of the whole run, in the order of the work."""
    return (
        *_people(QUESTIONS_BEFORE),
        Paragraph("Rows", _rows(facts)),
        *(Paragraph(f"Effect: {item.name}", _effect(item)) for item in facts.analyses),
        Paragraph("Percent change", PERCENT),
        Paragraph("Normal approximation", NORMAL),
        Paragraph("Main strategy", main_strategy_words(facts)),
        *_strategies(facts),
        Paragraph("Averages", average_words(facts)),
        Paragraph("Shared arms", shared_arms(facts)),
        Paragraph("Model", model_words(facts)),
        Paragraph("Intervals and tests", intervals(facts)),
        Paragraph("Heterogeneity", heterogeneity(facts)),
        Paragraph("Software", _software(facts)),
        *_people(QUESTIONS_AFTER),
    )


QUESTIONS_BEFORE = (
    ("Question", "Which question was asked, of what, where, and what counts as an answer."),
    ("Search and selection", "Where and when studies were searched, and by which rules selected."),
    ("Appraisal", "How the quality and the relevance of each study were judged, and by whom."),
)
QUESTIONS_AFTER = (
    ("Interpretation", "What the numbers mean for the question, and what they cannot show."),
    ("Interests and money", "Who paid, and who has an interest in the outcome."),
)

PERCENT = (
    "Models work on the log scale. An estimate and its limits x are printed as "
    "100 (exp(x) - 1): the percent change of a median ratio. No correction to a mean ratio is made."
)
NORMAL = (
    "The log of a mean is close to normal only where the mean lies far from zero against its "
    "standard error. Each arm with an SD is checked by 4 n^1.5 / (1 + 4 n) times mean over SD "
    "(Geary 1930, small-sample form in Lajeunesse 2015). A row fails when an arm lies below "
    f"{GEARY_LIMIT:g}, a limit of common practice, no source. Failing rows are named and stay in."
)


def _people(questions: Iterable[tuple[str, str]]) -> list[Paragraph]:
    return [Paragraph(heading, text, person=True) for heading, text in questions]


def _strategies(facts: ReportFacts) -> list[Paragraph]:
    declared = {strategy.name for strategy in facts.settings.strategies}
    return [
        Paragraph(f"Strategy: {name}", strategy_words(strategy, name in declared))
        for name, strategy in facts.settings.all_strategies().items()
    ]


def _rows(facts: ReportFacts) -> str:
    n_rule = {
        "leave": "Rows without n left the analysis.",
        "study minimum": "A missing n was taken as the smallest n of the same study.",
        "outcome median": "A missing n was taken as the median n of the same outcome.",
    }[facts.settings.missing_n]
    zero = (
        "An SD of zero counted as missing."
        if facts.settings.zero_sd == "missing"
        else "An SD of zero was kept where the other arm varies."
    )
    holds = (
        f"The sheet holds {numbers.count(facts.flow.rows_in, 'comparison')} from "
        f"{numbers.count(facts.flow.studies_in, 'study', 'studies')}."
    )
    ledger = "Every row that left is in the ledger with its reason."
    return " ".join(part for part in (holds, n_rule, zero, spreads(facts), ledger) if part)


def _effect(analysis: AnalysisFacts) -> str:
    settings = analysis.settings
    text = (
        f"Outcome: {listed(settings.outcome)}. The effect is the natural log of treatment mean "
        "over control mean"
    )
    if settings.order == scales.SECOND:
        text += (
            " (Hedges et al. 1999), with the second-order estimator and variance: y + (a - b)/2 "
            "and a + b + (a² + b²)/2, where a and b are CV²/n of treatment and control "
            "(Lajeunesse 2015)"
        )
    else:
        text += (
            " (Hedges et al. 1999), first order, with variance a + b, the sum of CV²/n of the two "
            "arms"
        )
    turned = int(analysis.slice["flip"].sum())
    turn = f" The sign was turned in {numbers.count(turned, 'row')}: smaller is better." * bool(
        turned
    )
    kept = filters(settings.where, settings.where_not)
    return f"{text}.{turn} {kept}".rstrip()


def _software(facts: ReportFacts) -> str:
    items = [f"{name} {version}" for name, version in facts.made_from.versions.items()]
    return f"{listed(items)}. Run {facts.made_from.run_id}."
