"""Tests that several contrasts are zero together."""

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.special import fdtrc

from drystone.maths.mixed_model.fit import Fit
from drystone.maths.mixed_model.inference import contrast_rows
from drystone.maths.mixed_model.problem import Floats
from drystone.maths.mixed_model.refuse import InvalidProblemError, TooFewStudiesError


@dataclass(frozen=True)
class JointTest:
    """An F test.

    Parameters
    ----------
    f : float
        Statistic.
    numerator_df, denominator_df : float
        Degrees of freedom.
    p : float
        Upper tail.
    method : str
        Where covariance and degrees of freedom come from.
    """

    f: float
    numerator_df: float
    denominator_df: float
    p: float
    method: str


def joint_test(fit: Fit, contrasts: ArrayLike) -> JointTest:
    """Model-based F test with studies - p denominator degrees of freedom.

    Parameters
    ----------
    fit : Fit
        A fitted model.
    contrasts : array, shape (q, p)
        Linearly independent rows of weights on the coefficients.

    Raises
    ------
    InvalidProblemError, TooFewStudiesError
        If the contrasts repeat each other, or the studies leave no degrees of freedom.
    """
    rows = contrast_rows(fit, contrasts)[1]
    covariance = rows @ fit.covariance @ rows.T
    check_independent(covariance)
    df = float(fit.studies - len(fit.coefficients))
    check_denominator(len(rows), df)
    wald = wald_statistic(rows @ fit.coefficients, covariance)
    method = "model-based covariance, F with studies minus coefficients degrees of freedom"
    return f_test(wald / len(rows), len(rows), df, method)


def wald_statistic(estimates: Floats, covariance: Floats) -> float:
    """Return estimates' inverse(covariance) estimates."""
    return float(estimates @ np.linalg.solve(covariance, estimates))


def check_independent(covariance: Floats) -> None:
    """Refuse contrasts whose covariance is singular.

    Raises
    ------
    InvalidProblemError
        If one contrast is a combination of the others.
    """
    size = np.sqrt(np.diag(covariance))
    if not size.all() or np.linalg.eigvalsh(covariance / np.outer(size, size))[0] < 1e-12:
        raise InvalidProblemError("The contrasts are not independent of each other.")


def check_denominator(contrasts: int, degrees_of_freedom: float) -> None:
    """Refuse a joint test without degrees of freedom.

    Raises
    ------
    TooFewStudiesError
        If none are left.
    """
    if degrees_of_freedom <= 0.0:
        raise TooFewStudiesError(
            f"The studies leave no degrees of freedom for a joint test of {contrasts} contrasts.",
            contrasts=contrasts,
        )


def f_test(f: float, numerator_df: float, denominator_df: float, method: str) -> JointTest:
    """Assemble an F test."""
    p = float(fdtrc(numerator_df, denominator_df, f))
    return JointTest(f, numerator_df, denominator_df, p, method)
