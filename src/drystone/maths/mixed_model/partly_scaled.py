"""An estimated factor for the sampling variances of some rows only.

Rows whose spread is known keep their variances; those of the marked rows are multiplied by phi,
and covariances between the two kinds by sqrt(phi) (Nakagawa et al. 2023 describe the diagonal
form; the square root keeps V a covariance matrix for every phi). With S = diag(1 or sqrt(phi)),
V(phi) = S V S, so that with E = 1 for marked rows

    d l / d ln(phi) = (-tr(E V P) + y'P E V P y) / 2 ,

all other components at their best (own derivation).
"""

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike

from drystone.maths.mixed_model.criterion import Estimator, evaluate, unwhiten
from drystone.maths.mixed_model.fit import Fit, fit
from drystone.maths.mixed_model.prepare import Prepared, prepare
from drystone.maths.mixed_model.problem import SCALE, Floats, Problem
from drystone.maths.mixed_model.refuse import (
    FlatLikelihoodError,
    InvalidProblemError,
    SingularCovarianceError,
)

#: Values of ln(phi) that are tried before the root is refined: phi from 1/400 to 400.
GRID = np.linspace(-6.0, 6.0, 13)


@dataclass(frozen=True)
class PartlyScaled:
    """A fit with an estimated factor for the variances of some rows.

    Parameters
    ----------
    factor : float
        phi.
    fit : Fit
        The model at that factor; its log-likelihood is the joint maximum.
    prepared : Prepared
        The problem at that factor, for everything that is derived from the fit.
    scaled_rows : int
        Number of rows that the factor rests on.
    """

    factor: float
    fit: Fit
    prepared: Prepared
    scaled_rows: int


def fit_partly_scaled(
    problem: Problem, scaled: ArrayLike, estimator: Estimator = "REML"
) -> PartlyScaled:
    """Estimate the factor of the marked rows together with the components.

    Parameters
    ----------
    problem : Problem
        The rows, with V at factor one.
    scaled : array of bool, shape (K,)
        The marked rows: some, but not all.
    estimator : {"REML", "ML"}
        Which likelihood.

    Raises
    ------
    InvalidProblemError
        If no row or every row is marked, or the problem already has the level `scale`.
    FlatLikelihoodError
        If the factor runs out of the range from 1/400 to 400.
    """
    from scipy.optimize import brentq  # 0.2 s that most fits never need

    marked = _marked(problem, scaled)
    values = [_at(problem, marked, estimator, x)[1].log_likelihood for x in GRID]
    best = int(np.argmax(values))
    if best in (0, len(GRID) - 1):
        raise FlatLikelihoodError(
            f"The rows do not bound the factor of the {int(marked.sum())} marked rows: "
            f"it runs to {np.exp(GRID[best]):.3g}.",
            factor=float(np.exp(GRID[best])),
        )

    def score(x: float) -> float:
        return _score(*_at(problem, marked, estimator, x), marked)

    x = float(brentq(score, GRID[best - 1], GRID[best + 1], xtol=1e-15, rtol=1e-15))
    prepared, fitted = _at(problem, marked, estimator, x)
    return PartlyScaled(float(np.exp(x)), fitted, prepared, int(marked.sum()))


def scale_rows(problem: Problem, scaled: ArrayLike, factor: float) -> Problem:
    """Return the problem with the variances of marked rows multiplied by `factor`."""
    root = np.where(_marked(problem, scaled), np.sqrt(factor), 1.0)
    known = problem.known
    changed = replace(
        known,
        variances=known.variances * root**2,
        covariances=known.covariances * root[known.rows_i] * root[known.rows_j],
    )
    return replace(problem, known=changed)


def _marked(problem: Problem, scaled: ArrayLike) -> np.ndarray:
    marked = np.asarray(scaled)
    if marked.shape != problem.y.shape or marked.dtype != np.bool_:
        raise InvalidProblemError("Say of each row whether its variance is multiplied.")
    if marked.all() or not marked.any() or SCALE in problem.term_names:
        raise InvalidProblemError(
            "A factor of some variances needs rows of both kinds and no factor of all of them."
        )
    return marked


def _at(
    problem: Problem, marked: np.ndarray, estimator: Estimator, x: float
) -> tuple[Prepared, Fit]:
    prepared = prepare(scale_rows(problem, marked, float(np.exp(x))))
    return prepared, fit(prepared, estimator)


def _score(prepared: Prepared, fitted: Fit, marked: np.ndarray) -> float:
    """D l / d ln(phi) at the best components."""
    at = evaluate(prepared, fitted.theta, fitted.estimator)
    if at is None:
        raise SingularCovarianceError("The fitted covariance has no inverse.")
    chosen = marked[prepared.order]
    pulled = unwhiten(prepared, at.weights, at.white_residual[None])
    own = _diagonal_of_product(prepared, fitted)
    if fitted.estimator == "REML":
        own = own - _elementwise(prepared, unwhiten(prepared, at.weights, at.white_basis))
    forces = _elementwise(prepared, pulled)
    return 0.5 * float((forces - own)[chosen].sum())


def _elementwise(prepared: Prepared, columns: Floats) -> Floats:
    """Sum over columns c of (V c) * c, row by row in the unrotated axes."""
    rotation = prepared.rotation
    known = rotation.undo(rotation.variances * columns)
    product: Floats = (known * rotation.undo(columns)).sum(axis=0)
    return product


def _diagonal_of_product(prepared: Prepared, fitted: Fit) -> Floats:
    """Diagonal of V inverse(Sigma), unrotated."""
    at = evaluate(prepared, fitted.theta, fitted.estimator)
    if at is None:
        raise SingularCovarianceError("The fitted covariance has no inverse.")
    weights, rotation = at.weights, prepared.rotation
    plain = rotation.undo_diagonal(rotation.variances * weights.precision)
    taken = (weights.between_variance * weights.shrink)[prepared.segment]
    return plain - taken * _elementwise(prepared, weights.pulled[None])
