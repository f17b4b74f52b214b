"""Mixed models with known sampling covariance, fitted by restricted or full likelihood.

    y = X b + study + row + e,   e ~ N(0, V) known and block-diagonal by study

Use:

    problem = Problem(y, X, ("overall",), study, KnownCovariance(v, i, j, cov), ("study", "row"))
    prepared = prepare(problem)            # sorted, rotated, factored; reusable
    fitted = fit(prepared, "REML")         # Fit: coefficients, covariance, components, certificate

A model that cannot be fitted raises a `Refusal` with a sentence, a machine-readable `reason` and
the facts behind it; callers turn it into a result.
"""

from drystone.maths.mixed_model.fit import CONVENTIONS, Certificate, Fit, fit
from drystone.maths.mixed_model.prepare import Prepared, prepare
from drystone.maths.mixed_model.problem import KnownCovariance, Problem, Term
from drystone.maths.mixed_model.refuse import Refusal

__all__ = [
    "CONVENTIONS",
    "Certificate",
    "Fit",
    "KnownCovariance",
    "Prepared",
    "Problem",
    "Refusal",
    "Term",
    "fit",
    "prepare",
]
