"""Tests and intervals for coefficients and their contrasts."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import stdtr, stdtrit

from drystone.maths.mixed_model.criterion import evaluate
from drystone.maths.mixed_model.fit import Fit
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats
from drystone.maths.mixed_model.refuse import (
    InvalidProblemError,
    SingularCovarianceError,
    TooFewStudiesError,
    counted,
)


@dataclass(frozen=True)
class Inference:
    """Estimates with t tests and intervals, one entry per coefficient or contrast.

    Parameters
    ----------
    names : tuple of str
        What each entry estimates.
    estimates, standard_errors, degrees_of_freedom, t, p, low, high : arrays, shape (c,)
        `p` is two-sided against zero.
    confidence_percent : float
        Confidence of the interval from `low` to `high`.
    method : str
        Where the standard error and the degrees of freedom come from.
    """

    names: tuple[str, ...]
    estimates: Floats
    standard_errors: Floats
    degrees_of_freedom: Floats
    t: Floats
    p: Floats
    low: Floats
    high: Floats
    confidence_percent: float
    method: str


def infer(
    names: tuple[str, ...],
    estimates: Floats,
    standard_errors: Floats,
    degrees_of_freedom: Floats,
    confidence_percent: float,
    method: str,
) -> Inference:
    """Assemble t tests and intervals from estimates, standard errors and degrees of freedom."""
    df = np.broadcast_to(np.asarray(degrees_of_freedom, dtype=np.float64), estimates.shape)
    with np.errstate(divide="ignore", invalid="ignore"):
        t = estimates / standard_errors
    reach = t_quantile(df, confidence_percent) * standard_errors
    return Inference(
        names=names,
        estimates=estimates,
        standard_errors=standard_errors,
        degrees_of_freedom=df.copy(),
        t=t,
        p=2.0 * stdtr(df, -np.abs(t)),
        low=estimates - reach,
        high=estimates + reach,
        confidence_percent=confidence_percent,
        method=method,
    )


def t_quantile(degrees_of_freedom: ArrayLike, confidence_percent: float) -> Floats:
    """Half-width of a two-sided t interval in standard errors."""
    if not 0.0 < confidence_percent < 100.0:
        raise InvalidProblemError("The confidence must lie between 0 and 100 percent.")
    quantile: Floats = stdtrit(degrees_of_freedom, 0.5 + confidence_percent / 200.0)
    return quantile


def contrast_rows(fit: Fit, contrasts: ArrayLike | None) -> tuple[tuple[str, ...], Floats]:
    """Names and rows, shape (c, p), of contrasts; the coefficients themselves by default."""
    width = len(fit.coefficients)
    if contrasts is None:
        return fit.coefficient_names, np.eye(width)
    rows = np.atleast_2d(np.asarray(contrasts, dtype=np.float64))
    if rows.shape[1] != width:
        raise InvalidProblemError(f"A contrast needs {width} weights, not {rows.shape[1]}.")
    return tuple(f"contrast {k + 1}" for k in range(len(rows))), rows


def model_based(
    fit: Fit, contrasts: ArrayLike | None = None, confidence_percent: float = 95.0
) -> Inference:
    """Test and interval with the model's own standard errors and studies - p degrees of freedom.

    Parameters
    ----------
    fit : Fit
        A fitted model.
    contrasts : array, shape (c, p), optional
        Rows of weights on the coefficients.
    confidence_percent : float
        Confidence of the intervals.

    Raises
    ------
    TooFewStudiesError
        If there are no more studies than coefficients.
    """
    df = fit.studies - len(fit.coefficients)
    if df < 1:
        raise TooFewStudiesError(
            f"With {counted(fit.studies, 'study', 'studies')}, no degree of freedom is left beside "
            f"{counted(len(fit.coefficients), 'coefficient')}.",
            studies=fit.studies,
            coefficients=len(fit.coefficients),
        )
    names, rows = contrast_rows(fit, contrasts)
    errors = np.sqrt(np.einsum("ci,ij,cj->c", rows, fit.covariance, rows))
    return infer(
        names,
        rows @ fit.coefficients,
        errors,
        np.array(float(df)),
        confidence_percent,
        "model-based standard error, t with studies minus coefficients degrees of freedom",
    )


def residual_scale(prepared: Prepared, fit: Fit) -> float:
    """Return r' inverse(Sigma) r / (K - p), the Knapp-Hartung factor (2003, Stat Med 22:2693)."""
    at = evaluate(prepared, fit.theta, fit.estimator)
    if at is None:
        raise SingularCovarianceError("The fitted covariance has no inverse.")
    return at.quadratic / (prepared.rows - prepared.width)


def scaled_by_residuals(
    prepared: Prepared, fit: Fit, confidence_percent: float = 95.0, *, at_least_one: bool = False
) -> Inference:
    """Knapp-Hartung inference: standard errors times sqrt(q), t with rows - p.

    Parameters
    ----------
    prepared, fit : Prepared, Fit
        The problem and its fit.
    confidence_percent : float
        Confidence of the intervals.
    at_least_one : bool
        Never let the factor narrow the interval (the ad hoc variant).
    """
    scale = residual_scale(prepared, fit)
    if at_least_one:
        scale = max(scale, 1.0)
    return infer(
        fit.coefficient_names,
        fit.coefficients,
        fit.standard_errors * np.sqrt(scale),
        np.array(float(prepared.rows - prepared.width)),
        confidence_percent,
        "Knapp-Hartung: model-based standard error scaled by the residuals, t with rows minus "
        "coefficients degrees of freedom",
    )
