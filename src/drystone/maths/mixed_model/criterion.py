"""Restricted and full log-likelihood with first and second derivatives, in O(K p^2).

In the rotated axes the covariance of a study is diag(m) + s z z'. Each column f is split into
f = z c + f_w with z' diag(1/m) f_w = 0, so that

    f' inverse(diag(m) + s z z') g = f_w' diag(1/m) g_w + c_f c_g w h,
    w = z' diag(1/m) z,  h = 1 / (1 + s w),

a sum of products without cancellation, however large s is beside m (own algebra). "White" columns
below are the K + J coordinates f_w / sqrt(m) and c sqrt(w h).
"""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy.linalg import solve_triangular

from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats

Estimator = Literal["REML", "ML"]


@dataclass(frozen=True)
class Weights:
    """The inverse covariance at one value of the components.

    Parameters
    ----------
    between_variance : float
        The study component s.
    precision, root, pulled : arrays, shape (K,)
        1 / m, its square root, z / m.
    mass, shrink, between_root : arrays, shape (J,)
        w, h and sqrt(w h).
    log_determinant : float
        ln |Sigma|.
    """

    between_variance: float
    precision: Floats
    root: Floats
    pulled: Floats
    mass: Floats
    shrink: Floats
    between_root: Floats
    log_determinant: float


@dataclass(frozen=True)
class Evaluation:
    """Log-likelihood at `theta`, with what the derivatives need.

    Parameters
    ----------
    theta : array, shape (q,)
        Components, in the order of `Prepared.term_names`.
    log_likelihood : float
        See `CONVENTIONS`.
    quadratic : float
        r' inverse(Sigma) r.
    coordinates : array, shape (p,)
        Coefficients in the orthonormal basis, without the offset.
    factor : array, shape (p, p)
        Upper triangle with factor' factor = basis inverse(Sigma) basis'.
    white_residual : array, shape (K + J,)
        Whitened residual.
    white_basis : array, shape (p, K + J)
        Orthonormal rows that span the whitened design.
    """

    theta: Floats
    log_likelihood: float
    quadratic: float
    coordinates: Floats
    factor: Floats
    white_residual: Floats
    white_basis: Floats
    weights: Weights


def weigh(prepared: Prepared, theta: Floats) -> Weights | None:
    """Build the inverse covariance, or None where the covariance has no inverse."""
    diagonal = prepared.base
    for slope, k in zip(prepared.slopes, prepared.diagonal_terms, strict=True):
        diagonal = diagonal + theta[k] * slope
    if diagonal.min() <= 0.0:
        return None
    between = 0.0 if prepared.study_term is None else float(theta[prepared.study_term])
    precision = 1.0 / diagonal
    pulled = prepared.ones * precision
    mass = prepared.sum_by_study(prepared.ones * pulled)
    shrink = 1.0 / (1.0 + between * mass)
    return Weights(
        between_variance=between,
        precision=precision,
        root=np.sqrt(precision),
        pulled=pulled,
        mass=mass,
        shrink=shrink,
        between_root=np.sqrt(mass * shrink),
        log_determinant=float(np.log(diagonal).sum() + np.log1p(between * mass).sum()),
    )


def whiten(prepared: Prepared, weights: Weights, columns: Floats) -> Floats:
    """White coordinates, shape (c, K + J), of rotated `columns`, shape (c, K)."""
    centre = prepared.sum_by_study(weights.pulled * columns) / weights.mass
    within = columns - prepared.ones * centre[:, prepared.segment]
    return np.hstack([within * weights.root, centre * weights.between_root])


def unwhiten(prepared: Prepared, weights: Weights, white: Floats) -> Floats:
    """inverse(Sigma) times columns, shape (c, K), from their white coordinates."""
    rows = prepared.rows
    centre = white[:, rows:] * (weights.shrink / weights.between_root)
    return weights.root * white[:, :rows] + weights.pulled * centre[:, prepared.segment]


def evaluate(prepared: Prepared, theta: Floats, estimator: Estimator) -> Evaluation | None:
    """Log-likelihood at `theta`, or None where the covariance has no inverse.

    Parameters
    ----------
    prepared : Prepared
        The problem.
    theta : array, shape (q,)
        Components, zero or above.
    estimator : {"REML", "ML"}
        Which likelihood.
    """
    weights = weigh(prepared, theta)
    if weights is None:
        return None
    white = whiten(prepared, weights, np.vstack([prepared.basis, prepared.response]))
    design, response = white[:-1], white[-1]
    basis, factor = _orthonormal(design)
    projected = basis @ response
    residual = response - projected @ basis
    again_projected = basis @ residual
    residual = residual - again_projected @ basis
    quadratic = float(residual @ residual)
    return Evaluation(
        theta=theta,
        log_likelihood=_log_likelihood(prepared, weights, factor, quadratic, estimator),
        quadratic=quadratic,
        coordinates=solve_triangular(factor, projected + again_projected),
        factor=factor,
        white_residual=residual,
        white_basis=basis,
        weights=weights,
    )


def _orthonormal(design: Floats) -> tuple[Floats, Floats]:
    """Return orthonormal rows spanning `design`, shape (p, n), and the factor (p, p)."""
    if len(design) == 1:
        length = np.sqrt(design @ design.T)
        return design / length, length
    columns, factor = np.linalg.qr(design.T)
    return np.ascontiguousarray(columns.T), factor


def _log_likelihood(
    prepared: Prepared, weights: Weights, factor: Floats, quadratic: float, estimator: Estimator
) -> float:
    free = prepared.rows - (prepared.width if estimator == "REML" else 0)
    value = free * np.log(2.0 * np.pi) + weights.log_determinant + quadratic
    if estimator == "REML":
        value += 2.0 * np.log(np.abs(np.diag(factor))).sum()
    return float(-0.5 * value)
