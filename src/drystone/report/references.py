"""Publications whose methods a run used."""

from __future__ import annotations

from drystone.report.facts import ReportFacts
from drystone.words import scales, strategies

REFERENCES = {
    "log ratio": "Hedges, L. V., Gurevitch, J. & Curtis, P. S. (1999) The meta-analysis of "
    "response ratios in experimental ecology. Ecology 80: 1150-1156.",
    "shared": "Lajeunesse, M. J. (2011) On the meta-analysis of response ratios for studies with "
    "correlated and multi-group designs. Ecology 92: 2049-2055.",
    "second": "Lajeunesse, M. J. (2015) Bias and correction for the log response ratio in "
    "ecological meta-analysis. Ecology 96: 2056-2063.",
    "normal": "Geary, R. C. (1930) The frequency distribution of the quotient of two normal "
    "variates. Journal of the Royal Statistical Society 93: 442-446.",
    "missing": "Nakagawa, S. et al. (2023) A robust and readily implementable method for the "
    "meta-analysis of response ratios with and without missing standard deviations. Ecology "
    "Letters 26: 232-244.",
    "average": "Doncaster, C. P. & Spake, R. (2018) Correction for bias in meta-analysis of "
    "little-replicated studies. Methods in Ecology and Evolution 9: 634-644.",
    "cluster": "Bell, R. M. & McCaffrey, D. F. (2002) Bias reduction in standard errors for "
    "linear regression with multi-stage samples. Survey Methodology 28: 169-181.",
    "cluster, general": "Pustejovsky, J. E. & Tipton, E. (2018) Small-sample methods for "
    "cluster-robust variance estimation and hypothesis testing in fixed effects models. Journal "
    "of Business & Economic Statistics 36: 672-683.",
    "few studies": "Tipton, E. (2015) Small sample adjustments for robust variance estimation with "
    "meta-regression. Psychological Methods 20: 375-393.",
    "prediction": "Higgins, J. P. T., Thompson, S. G. & Spiegelhalter, D. J. (2009) A "
    "re-evaluation of random-effects meta-analysis. Journal of the Royal Statistical Society A "
    "172: 137-159.",
    "heterogeneity": "Higgins, J. P. T. & Thompson, S. G. (2002) Quantifying heterogeneity in a "
    "meta-analysis. Statistics in Medicine 21: 1539-1558.",
    "levels": "Nakagawa, S. & Santos, E. S. A. (2012) Methodological issues and advances in "
    "biological meta-analysis. Evolutionary Ecology 26: 1253-1274.",
    "relative": "Yang, Y. et al. (2025) doi 10.1111/2041-210x.70155.",
    "explained": "Nakagawa, S. & Schielzeth, H. (2013) A general and simple method for obtaining "
    "R² from generalized linear mixed-effects models. Methods in Ecology and Evolution 4: "
    "133-142.",
}
ALWAYS = ("log ratio", "normal", "second", "heterogeneity", "levels")  # "second" for Geary as well


def references(facts: ReportFacts) -> tuple[str, ...]:
    """Publications whose methods this run used, in order of the authors."""
    used = set(ALWAYS) if facts.analyses else set()
    if any(item.settings.shared_controls == "covariance" for item in facts.analyses):
        used.add("shared")
    if any(s.use != strategies.COMPLETE_CASES for s in facts.settings.strategies):
        used |= {"missing", "average"}
    if facts.settings.inference.interval == scales.CLUSTER_ROBUST:
        used |= {"cluster", "cluster, general", "few studies"}
    if has_models(facts, overall=True):
        used |= {"prediction", "relative"}
    if has_models(facts, overall=False):
        used.add("explained")
    return tuple(sorted(REFERENCES[key] for key in used))


def has_models(facts: ReportFacts, *, overall: bool) -> bool:
    """Whether the run holds a model without (``overall``) or with moderators."""
    every = (m for a in facts.analyses for s in a.strategies for m in s.models)
    return any(model.is_overall == overall for model in every)
