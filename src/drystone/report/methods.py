"""The methods in words, written from the settings of the run: what was done, nothing more."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass

from drystone.maths.mixed_model.fit import CONVENTIONS
from drystone.report import numbers
from drystone.report.facts import AnalysisFacts, ReportFacts
from drystone.report.sentences import filters, listed
from drystone.settings.model import Strategy
from drystone.words import scales, strategies

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
        *(Paragraph(f"Strategy: {name}", _strategy(s)) for name, s in _strategies(facts)),
        Paragraph("Averages", _averages(facts)),
        Paragraph("Shared arms", _shared(facts)),
        Paragraph("Model", _model(facts)),
        Paragraph("Intervals and tests", _intervals(facts)),
        Paragraph("Heterogeneity", _heterogeneity()),
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

CAUTIONS = (
    "This page is a statistical summary of what was typed into the extraction sheet. It is not "
    "advice, and it recommends no action.",
    "A narrow interval does not make a weak study strong: judge the quality and the relevance of "
    "the studies before leaning on any number here.",
    "Where a decision touches land, animals, health, safety or the law, local rules and qualified "
    "practice come first.",
    "A percent change here is a median ratio: half of the true ratios are expected above it. The "
    "mean ratio is larger when effects differ between studies.",
)

REFERENCES = {
    "log ratio": "Hedges, L. V., Gurevitch, J. & Curtis, P. S. (1999) Ecology 80: 1150-1156.",
    "shared": "Lajeunesse, M. J. (2011) Ecology 92: 2049-2055.",
    "second": "Lajeunesse, M. J. (2015) Ecology 96: 2056-2063.",
    "missing": "Nakagawa, S. et al. (2023) Ecology Letters 26: 232-244.",
    "average": "Doncaster, C. P. & Spake, R. (2018) Methods in Ecology and Evolution 9: 634-644.",
    "cluster": "Bell, R. M. & McCaffrey, D. F. (2002) Survey Methodology 28: 169-181.",
    "cluster, general": "Pustejovsky, J. E. & Tipton, E. (2018) Journal of Business & Economic "
    "Statistics 36: 672-683.",
    "prediction": "Higgins, J. P. T., Thompson, S. G. & Spiegelhalter, D. J. (2009) Journal of "
    "the Royal Statistical Society A 172: 137-159.",
}


def references(facts: ReportFacts) -> tuple[str, ...]:
    """Publications whose methods this run used, in order of the authors."""
    used = {"log ratio", "prediction"}
    if any(item.settings.order == scales.SECOND for item in facts.analyses):
        used.add("second")
    if any(item.settings.shared_controls == "covariance" for item in facts.analyses):
        used.add("shared")
    if any(s.use != strategies.COMPLETE_CASES for _, s in _strategies(facts)):
        used |= {"missing", "average"}
    if facts.settings.inference.interval == scales.CLUSTER_ROBUST:
        used |= {"cluster", "cluster, general"}
    return tuple(sorted(REFERENCES[key] for key in used))


def _people(questions: Iterable[tuple[str, str]]) -> list[Paragraph]:
    return [Paragraph(heading, text, person=True) for heading, text in questions]


def _strategies(facts: ReportFacts) -> list[tuple[str, Strategy]]:
    return list(facts.settings.all_strategies().items())


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
    return (
        f"The sheet holds {numbers.count(facts.flow.rows_in, 'comparison')} from "
        f"{numbers.count(facts.flow.studies_in, 'study', 'studies')}. {n_rule} {zero} Spreads "
        "reported as something else than an SD were converted; each conversion is listed under "
        "Derivations. A blank SD of an arm that reports one in another row was read from there. "
        "Every row that left is in the ledger with its reason."
    )


def _effect(analysis: AnalysisFacts) -> str:
    settings = analysis.settings
    text = (
        f"Outcome: {listed(settings.outcome)}. The effect is the natural log of treatment mean "
        "over control mean"
    )
    if settings.order == scales.SECOND:
        text += (
            ", with the second-order estimator and variance: y + (a - b)/2 and "
            "a + b + (a² + b²)/2, where a and b are CV²/n of treatment and control"
        )
    else:
        text += ", first order, with variance a + b, the sum of CV²/n of the two arms"
    turned = int(analysis.slice["flip"].sum())
    turn = f" The sign was turned in {numbers.count(turned, 'row')}: smaller is better." * bool(
        turned
    )
    kept = filters(settings.where, settings.where_not)
    return f"{text}.{turn} {kept}".rstrip()


def _strategy(strategy: Strategy) -> str:
    text = {
        strategies.COMPLETE_CASES: "Only rows in which both arms have an SD; each arm uses its own "
        "CV.",
        strategies.MISSING_CASES: "All usable rows. An arm with an SD uses its own CV; an arm "
        "without one borrows the average CV.",
        strategies.ALL_CASES: "Every arm uses the average CV, whether it reports an SD or not, in "
        "the variance and in the correction of the effect.",
    }[strategy.use]
    if strategy.rows == strategies.COMPLETE_ROWS:
        text += (
            " Restricted to rows in which both arms have an SD, so that the effect of the weights "
            "can be told from the effect of the rows."
        )
    if strategy.use == strategies.COMPLETE_CASES:
        return text
    reading = {
        strategies.SQUARE_OF_MEAN: "the square of the n-weighted mean CV",
        strategies.MEAN_OF_SQUARES: "the n-weighted mean of the squared CVs",
    }[strategy.average_cv]
    over = (
        "separately for control and treatment arms of each outcome"
        if strategy.average_over == strategies.BY_ARM
        else "over control and treatment arms together"
    )
    return f"{text} The average is {reading}, taken {over}."


def _averages(facts: ReportFacts) -> str:
    if all(s.use == strategies.COMPLETE_CASES for _, s in _strategies(facts)):
        return "No strategy borrowed an average CV."
    return (
        "Each physical arm counts once in an average, however many rows use it. Borrowing is per "
        "physical arm: an arm has one CV in every row, variance, covariance and correction. Where "
        "fewer than ten arms report an SD, the average was pooled upward, as the table of averages "
        "says. SDs that are one value for both arms stay out of averages by arm."
    )


def _shared(facts: ReportFacts) -> str:
    ignoring = [a.name for a in facts.analyses if a.settings.shared_controls == "ignore"]
    if len(ignoring) == len(facts.analyses):
        return "Rows that share an arm were treated as independent, as the config declares."
    text = (
        "Rows that share an arm share its sampling error. Their covariance is the shared arm's "
        "part of the variance: CV²/n, plus (CV²/n)²/2 in second order."
    )
    return text + f" Not so in {listed(ignoring)}, as declared." * bool(ignoring)


def _model(facts: ReportFacts) -> str:
    levels = {" and ".join(a.settings.levels) for a in facts.analyses}
    estimator = facts.settings.inference.estimator
    words = {"REML": "restricted maximum likelihood", "ML": "maximum likelihood"}[estimator]
    return (
        f"Linear mixed model with known sampling covariance and a variance component for "
        f"{listed(sorted(levels), 'or')}, fitted by {words} ({estimator}). A component may be "
        "exactly zero. A model that cannot be identified from the rows is refused with its reason. "
        f"Log-likelihoods follow the convention {CONVENTIONS[estimator]}, with S the fitted "
        "covariance of the rows and r the residual; REML values of models with different "
        "moderators are not comparable."
    )


def _intervals(facts: ReportFacts) -> str:
    inference = facts.settings.inference
    level = numbers.level_percent(inference.confidence_percent)
    robust = (
        "the CR2 cluster-robust standard error with studies as clusters and Satterthwaite degrees "
        "of freedom, with the t distribution"
    )
    plain = (
        "the model-based standard error and the t distribution with studies minus coefficients "
        "degrees of freedom"
    )
    first, beside = (
        (robust, plain) if inference.interval == scales.CLUSTER_ROBUST else (plain, robust)
    )
    return (
        f"Main intervals ({level}) use {first}. Beside them stand intervals from {beside}, where "
        "given. The prediction interval is for the true effect of a new comparison in a new study: "
        "estimate plus and minus t times the root of the summed components and the squared "
        "model-based standard error, t with studies minus coefficients degrees of freedom. It "
        "holds no sampling error of the new study."
    )


def _heterogeneity() -> str:
    return (
        "Q is the weighted sum of squares around the model under sampling error alone. I² by level "
        "is a component over the sum of all components and the typical sampling variance; where "
        "sampling variances rest on an average CV, I² is conditional on that average."
    )


def _software(facts: ReportFacts) -> str:
    items = [f"{name} {version}" for name, version in facts.made_from.versions.items()]
    return f"{listed(items)}. Run {facts.made_from.run_id}."
