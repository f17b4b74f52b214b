"""What the model says about effects that were not observed: new ones, and the studies' own."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from drystone.maths.mixed_model.criterion import evaluate
from drystone.maths.mixed_model.fit import Fit
from drystone.maths.mixed_model.inference import contrast_rows, t_quantile
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import ROW, SCALE, STUDY, Floats, Ints
from drystone.maths.mixed_model.refuse import InvalidProblemError, SingularCovarianceError

TARGETS = {
    frozenset(): "the mean effect (no level is in the model)",
    frozenset({STUDY}): "the mean effect of a new study",
    frozenset({ROW}): "a new effect",
    frozenset({STUDY, ROW}): "a new effect in a new study",
}


@dataclass(frozen=True)
class Prediction:
    """Prediction intervals for true effects (sampling error is not part of them).

    Parameters
    ----------
    estimates, standard_deviations, low, high : arrays, shape (c,)
        Centre, root of heterogeneity plus squared standard error, and ends.
    degrees_of_freedom : float
        Of the t quantile.
    confidence_percent : float
        Content of the interval.
    target : str
        What the interval is for.
    """

    estimates: Floats
    standard_deviations: Floats
    low: Floats
    high: Floats
    degrees_of_freedom: float
    confidence_percent: float
    target: str


@dataclass(frozen=True)
class StudyEffects:
    """Best linear unbiased predictions of the studies' deviations.

    Parameters
    ----------
    study : array of int, shape (J,)
        Codes of the studies, ascending.
    deviations : array, shape (J,)
        Predicted deviation from the fitted mean.
    prediction_variances : array, shape (J,)
        Variance of prediction minus truth, components taken as known.
    """

    study: Ints
    deviations: Floats
    prediction_variances: Floats


def prediction_interval(
    fit: Fit,
    contrasts: ArrayLike | None = None,
    confidence_percent: float = 95.0,
    levels: Sequence[str] | None = None,
) -> Prediction:
    """Interval mu +- t sqrt(sum of components + se^2), t with max(1, studies - p).

    Higgins, Thompson & Spiegelhalter 2009 (J R Stat Soc A 172:137), with degrees of freedom at the
    level of studies.

    Parameters
    ----------
    fit : Fit
        A fitted model.
    contrasts : array, shape (c, p), optional
        Design rows to predict at; required when the model has more than one coefficient.
    confidence_percent : float
        Content of the interval.
    levels : sequence of str, optional
        Levels that are new; all of the model's by default.
    """
    if contrasts is None and len(fit.coefficients) > 1:
        raise InvalidProblemError("Say for which design row the prediction is wanted.")
    _, rows = contrast_rows(fit, contrasts)
    chosen = _chosen(fit, levels)
    spread = sum(fit.components[name] for name in chosen)
    deviations = np.sqrt(spread + np.einsum("ci,ij,cj->c", rows, fit.covariance, rows))
    df = float(max(1, fit.studies - len(fit.coefficients)))
    reach = t_quantile(df, confidence_percent) * deviations
    centre = rows @ fit.coefficients
    target = TARGETS[frozenset(chosen)]
    return Prediction(
        centre, deviations, centre - reach, centre + reach, df, confidence_percent, target
    )


def _chosen(fit: Fit, levels: Sequence[str] | None) -> list[str]:
    known = [name for name in fit.components if name != SCALE]
    if levels is None:
        return known
    unknown = [name for name in levels if name not in known]
    if unknown:
        raise InvalidProblemError(f"The model has no level '{unknown[0]}'.", level=unknown[0])
    return list(levels)


def study_effects(prepared: Prepared, fit: Fit) -> StudyEffects:
    """Predicted deviation of each study, s z' P y, with its variance s - s^2 z' P z."""
    if prepared.study_term is None:
        raise InvalidProblemError("The model has no study level.", level=STUDY)
    at = evaluate(prepared, fit.theta, fit.estimator)
    if at is None:
        raise SingularCovarianceError("The fitted covariance has no inverse.")
    between, root = at.weights.between_variance, at.weights.between_root
    projected = at.white_basis[:, prepared.rows :]
    left = root**2 * (1.0 - (projected**2).sum(axis=0))
    return StudyEffects(
        study=prepared.problem.study[prepared.order][prepared.starts],
        deviations=between * root * at.white_residual[prepared.rows :],
        prediction_variances=between * (1.0 - between * left),
    )
