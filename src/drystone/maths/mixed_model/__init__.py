"""Mixed models with known sampling covariance, fitted by restricted or full likelihood.

    y = X b + study + row + e,   e ~ N(0, V) known and block-diagonal by study

Use:

    problem = Problem(y, X, ("overall",), study, KnownCovariance(v, i, j, cov), ("study", "row"))
    prepared = prepare(problem)            # sorted, rotated, factored; reusable
    fitted = fit(prepared, "REML")         # Fit: coefficients, covariance, components, certificate
    model_based(fitted)                    # t with studies - p
    cluster_robust(prepared, fitted).infer()             # CR2 by study, Satterthwaite df
    cluster_robust(prepared, fitted).joint_test(rows)    # several contrasts at once
    joint_test(fitted, rows)                             # the same, model-based
    prediction_interval(fitted)            # names its target
    study_effects(prepared, fitted)        # predicted deviations of the studies
    profile_interval(prepared, fitted, "study")
    zero_test(prepared, fitted, "study")
    fit_partly_scaled(problem, marked)     # a factor for the variances of marked rows
    prepare(problem.take(rows))            # the same model without a study

Levels are `study`, `row`, and `scale` (an estimated factor of V); any subset, or none. Functions
that return one entry per coefficient take contrast rows, shape (c, p), as well. Rows go in and
come out in the caller's order; units are those of y (variances: squared).

A model that cannot be fitted raises a `Refusal` with a sentence, a machine-readable `reason` and
the facts behind it; callers turn it into a result. Heterogeneity measures stand in
`drystone.maths.heterogeneity`.
"""

from drystone.maths.mixed_model.cluster_robust import ClusterRobust, cluster_robust
from drystone.maths.mixed_model.fit import CONVENTIONS, Certificate, Fit, fit
from drystone.maths.mixed_model.inference import (
    Inference,
    model_based,
    residual_scale,
    scaled_by_residuals,
)
from drystone.maths.mixed_model.joint import JointTest, joint_test
from drystone.maths.mixed_model.partly_scaled import (
    PartlyScaled,
    fit_partly_scaled,
    scale_rows,
)
from drystone.maths.mixed_model.predict import (
    Prediction,
    StudyEffects,
    prediction_interval,
    study_effects,
)
from drystone.maths.mixed_model.prepare import Prepared, prepare
from drystone.maths.mixed_model.problem import KnownCovariance, Problem, Term
from drystone.maths.mixed_model.profile import (
    ProfileInterval,
    ZeroTest,
    profile_interval,
    zero_test,
)
from drystone.maths.mixed_model.refuse import Refusal

__all__ = [
    "CONVENTIONS",
    "Certificate",
    "ClusterRobust",
    "Fit",
    "Inference",
    "JointTest",
    "KnownCovariance",
    "PartlyScaled",
    "Prediction",
    "Prepared",
    "Problem",
    "ProfileInterval",
    "Refusal",
    "StudyEffects",
    "Term",
    "ZeroTest",
    "cluster_robust",
    "fit",
    "fit_partly_scaled",
    "joint_test",
    "model_based",
    "prediction_interval",
    "prepare",
    "profile_interval",
    "residual_scale",
    "scale_rows",
    "scaled_by_residuals",
    "study_effects",
    "zero_test",
]
