"""The CR2 adjustment of small clusters, many at a time, with dense matrices.

With Phi = L L' in a cluster, H = (L^-1 X) M (L^-1 X)' and S = L' L, the matrix to be inverted is
B = S (I - H) S. Its inverse root comes from the singular values of (I - H)^(1/2) S, which keeps
the digits that squaring would lose; coefficients that only this cluster carries make I - H
singular, and the number of zero singular values is then known, not guessed (own derivation).
"""

from dataclasses import dataclass

import numpy as np
from scipy.linalg import solve_triangular

from drystone.maths.mixed_model.criterion import Evaluation
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats, Ints

#: A direction of the design with less than this share left outside the cluster is the cluster's.
OWNED = 1e-10


@dataclass(frozen=True)
class Levers:
    """U = A W X M of clusters of one size.

    Parameters
    ----------
    columns : array, shape (b, n, p)
        U of each cluster.
    variances : array, shape (b, p, p)
        U' Phi U of each cluster.
    """

    columns: Floats
    variances: Floats


def adjust_small(prepared: Prepared, at: Evaluation, bread: Floats, rows: Ints) -> Levers:
    """Levers of the clusters whose rows are `rows`, shape (b, n), in O(b n^3)."""
    root = np.asarray(np.linalg.cholesky(_covariances(prepared, at, rows)), dtype=np.float64)
    design = np.linalg.solve(root, prepared.basis[:, rows].transpose(1, 2, 0))
    half = design @ solve_triangular(at.factor, np.eye(prepared.width))
    columns = root @ (_inverse_root(root, half) @ (design @ bread))
    white = np.matmul(root.transpose(0, 2, 1), columns)
    return Levers(columns, np.matmul(white.transpose(0, 2, 1), white))


def _covariances(prepared: Prepared, at: Evaluation, rows: Ints) -> Floats:
    ones, segment = prepared.ones[rows], prepared.segment[rows]
    same = segment[:, :, None] == segment[:, None, :]
    made: Floats = at.weights.between_variance * same * ones[:, :, None] * ones[:, None, :]
    place = np.arange(rows.shape[1])
    made[:, place, place] += 1.0 / at.weights.precision[rows]
    return made


def _inverse_root(root: Floats, half: Floats) -> Floats:
    """Moore-Penrose B^(-1/2), where I - H = I - half half' and half has p columns."""
    left, share, _ = np.linalg.svd(half, full_matrices=False)
    rest = 1.0 - share**2
    owned = rest <= OWNED
    kept = np.sqrt(np.where(owned, 0.0, rest))
    square = np.matmul(root.transpose(0, 2, 1), root)
    lowered = square - np.matmul(left * (1.0 - kept)[:, None, :], left.transpose(0, 2, 1) @ square)
    _, values, axes = np.linalg.svd(lowered)
    size = values.shape[1]
    alive = np.arange(size) < size - owned.sum(axis=1)[:, None]
    inverse = np.where(alive, 1.0 / np.where(alive, values, 1.0), 0.0)
    made: Floats = np.matmul(axes.transpose(0, 2, 1) * inverse[:, None, :], axes)
    return made
