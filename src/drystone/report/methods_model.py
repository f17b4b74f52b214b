"""The methods in words, third part: shared arms, the model, intervals, heterogeneity."""

from __future__ import annotations

from collections.abc import Callable

from scipy.special import ndtri

from drystone.maths.mixed_model.fit import CONVENTIONS
from drystone.report import few_studies, numbers
from drystone.report.facts import AnalysisFacts, ReportFacts
from drystone.report.methods_spreads import borrows
from drystone.report.references import has_models
from drystone.report.sentences import listed
from drystone.words import scales

ROBUST = (
    "the CR2 cluster-robust standard error with studies as clusters (Bell & McCaffrey 2002; "
    "Pustejovsky & Tipton 2018) and the t distribution with Satterthwaite degrees of freedom"
)
PLAIN = (
    "the model-based standard error and the t distribution with studies minus coefficients "
    "degrees of freedom"
)


def shared_arms(facts: ReportFacts) -> str:
    """What was done with rows that share a physical arm."""
    ignoring = [a.name for a in facts.analyses if a.settings.shared_controls == "ignore"]
    if len(ignoring) == len(facts.analyses):
        return "Rows that share an arm were treated as independent, as the config declares."
    orders = {a.settings.order for a in facts.analyses if a.name not in ignoring}
    part = "CV²/n" + ", plus (CV²/n)²/2 in second order" * (scales.SECOND in orders)
    text = (
        "Rows that share an arm share its sampling error. Their covariance is the shared arm's "
        f"part of the variance, {part} (Lajeunesse 2011): positive where the arm has the same role "
        "in both rows, negative in a chain, where the treatment of one row is the control of the "
        "other."
    )
    return text + f" Not so in {listed(ignoring)}, as declared." * bool(ignoring)


def model_words(facts: ReportFacts) -> str:
    """The mixed model, its components by analysis, its likelihood."""
    estimator = facts.settings.inference.estimator
    words = {"REML": "restricted maximum likelihood", "ML": "maximum likelihood"}[estimator]
    text = (
        "Linear mixed model with known sampling covariance and a variance component for "
        f"{_levels(facts)}, fitted by {words} ({estimator}). A component may be exactly zero. A "
        "model that cannot be identified from the rows is refused with its reason. Log-likelihoods "
        f"follow the convention {CONVENTIONS[estimator]}, with S the fitted covariance of the rows "
        "and r the residual"
    )
    if estimator == "REML":
        text += "; REML values of models with different moderators are not comparable"
    return f"{text}."


def _levels(facts: ReportFacts) -> str:
    groups = _grouped(facts, lambda analysis: listed(analysis.settings.levels) or "no level")
    if len(groups) == 1:
        return next(iter(groups))
    return "; ".join(f"{levels} in {listed(names)}" for levels, names in groups.items())


def _grouped(facts: ReportFacts, key: Callable[[AnalysisFacts], str]) -> dict[str, list[str]]:
    groups: dict[str, list[str]] = {}
    for analysis in facts.analyses:
        groups.setdefault(key(analysis), []).append(analysis.name)
    return groups


def intervals(facts: ReportFacts) -> str:
    """Which intervals stand on the page, and by which reference distribution."""
    inference = facts.settings.inference
    level = numbers.level_percent(inference.confidence_percent)
    if inference.interval == scales.CLUSTER_ROBUST:
        text = f"Main intervals ({level}) use {ROBUST}. Beside them stand intervals from {PLAIN}."
        text += (
            f" Below {few_studies.FEWEST_DF:g} degrees of freedom an interval is marked (Tipton "
            "2015)."
        )
    else:
        text = f"Intervals ({level}) use {PLAIN}."
        text += f" Below {few_studies.FEWEST_DF:g} degrees of freedom an interval is marked."
    if has_models(facts, overall=True):
        text += (
            " The prediction interval is for the true effect of a new comparison in a new study: "
            "estimate plus and minus t times the root of the summed components and the squared "
            "model-based standard error, t with studies minus coefficients degrees of freedom "
            "(after Higgins, Thompson & Spiegelhalter 2009). It holds no sampling error of the new "
            "study."
        )
    times = numbers.number(float(ndtri(0.5 + inference.confidence_percent / 200)))
    text += (
        " The bars of single studies and rows are pictures of precision: plus and minus "
        f"{times} standard errors (normal distribution, not t)."
    )
    if borrows(facts):
        text += (
            " No interval carries the uncertainty of the average CV itself: it enters as if it "
            "were known."
        )
    return text


def heterogeneity(facts: ReportFacts) -> str:
    """Definitions of what stands under 'How sure', with their sources."""
    text = (
        "Q is the weighted sum of squares around the model under sampling error alone, against "
        "chi-squared with rows minus coefficients degrees of freedom. The typical sampling "
        "variance is (rows minus coefficients) over the trace of the projection that takes the "
        "model out of the inverse sampling covariance, which is that of Higgins & Thompson (2002) "
        "for independent rows and one mean. I² is the sum of all components over that sum plus the "
        "typical sampling variance, by level one component over the same (Nakagawa & Santos 2012)."
    )
    if has_models(facts, overall=True):
        text += (
            " CVH is the SD of true effects, the root of the summed components, over |overall "
            "effect|; M is that SD over (SD + |overall effect|) (Yang et al. 2025)."
        )
    if has_models(facts, overall=False):
        text += (
            " R² marginal is the variance of the fitted values over itself plus all components; "
            "R² conditional counts every component but that between rows as explained; sampling "
            "variance enters neither (after Nakagawa & Schielzeth 2013)."
        )
    if borrows(facts):
        text += (
            " Where sampling variances rest on an average CV, Q and I² are conditional on that "
            "average."
        )
    return text
