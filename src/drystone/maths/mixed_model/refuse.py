"""Why a model is refused: one class per reason, so that callers can turn a refusal into a result.

Every refusal carries a plain sentence (``str(refusal)``), a machine-readable ``reason`` and the
``facts`` (row indices, column names, numbers) that the sentence was made from.
"""

from typing import Any, ClassVar


class Refusal(Exception):
    """A model that cannot be fitted, with the reason why.

    Parameters
    ----------
    sentence : str
        What is wrong, in words a reader of the review understands.
    **facts : Any
        The values behind the sentence.
    """

    reason: ClassVar[str] = "refused"

    def __init__(self, sentence: str, **facts: Any) -> None:
        super().__init__(sentence)
        self.sentence = sentence
        self.facts: dict[str, Any] = facts


def counted(number: int, one: str, many: str = "") -> str:
    """Number with its noun, for a sentence: '1 row', '2 rows', '3 studies'."""
    return f"{number} {one if number == 1 else many or one + 's'}"


class InvalidProblemError(Refusal):
    """Arrays whose shapes or codes do not belong together."""

    reason = "invalid_problem"


class NonFiniteInputError(Refusal):
    """NaN or infinity among the responses, the design or the known covariance."""

    reason = "non_finite_input"


class UnsupportedTermError(Refusal):
    """A level that the engine does not know, or does not know yet."""

    reason = "unsupported_term"


class TooFewRowsError(Refusal):
    """No more rows than coefficients."""

    reason = "too_few_rows"


class TooFewStudiesError(Refusal):
    """No more studies than coefficients."""

    reason = "too_few_studies"


class SingleStudyError(Refusal):
    """A study level with one study only."""

    reason = "single_study"


class LevelsIndistinguishableError(Refusal):
    """Two levels that have the same effect on every contrast of the rows."""

    reason = "levels_indistinguishable"


class RankDeficientDesignError(Refusal):
    """Columns of the design that are linear combinations of others."""

    reason = "rank_deficient_design"


class NonPositiveVarianceError(Refusal):
    """A sampling variance of zero or below."""

    reason = "non_positive_variance"


class NotPositiveDefiniteError(Refusal):
    """A known covariance matrix that no set of rows could have."""

    reason = "known_covariance_not_positive_definite"


class SingularCovarianceError(Refusal):
    """A fitted covariance that has no inverse (perfectly correlated rows, no row level)."""

    reason = "singular_covariance"


class FlatLikelihoodError(Refusal):
    """A component about which the rows say nothing."""

    reason = "flat_likelihood"


class NoResidualsError(Refusal):
    """Rows that all lie exactly on the fitted values."""

    reason = "no_residuals"


class NotConvergedError(Refusal):
    """The search for the maximum did not end at one."""

    reason = "not_converged"


class ClustersCutStudiesError(Refusal):
    """Clusters between which the fitted model leaves covariance."""

    reason = "clusters_cut_studies"


class NoInterceptError(Refusal):
    """A quantity that has a meaning only for a model with one overall mean."""

    reason = "no_intercept"
