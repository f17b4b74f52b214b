"""Rotation of the rows into axes in which the known covariance is diagonal.

Rows that share no covariance are left as they are, so that their variances stay exact. Connected
rows (a shared control, a time series) are rotated by the eigenvectors of their small block; blocks
of one size are decomposed together. After that, V + s2 I is diagonal for every s2.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from drystone.maths.mixed_model.problem import Floats, Ints, KnownCovariance
from drystone.maths.mixed_model.refuse import NotPositiveDefiniteError

#: Eigenvalues below this share of the largest of their block are rounding error, not information.
ROUNDING = 1e-14


@dataclass(frozen=True)
class Rotation:
    """Orthogonal change of rows, block by block.

    Parameters
    ----------
    members : tuple of int arrays, each (blocks, size)
        Row numbers of the blocks of one size.
    vectors : tuple of arrays, each (blocks, size, size)
        Eigenvectors in columns.
    variances : array, shape (K,)
        Eigenvalues of V, in the places of the rows.
    """

    members: tuple[Ints, ...]
    vectors: tuple[Floats, ...]
    variances: Floats

    def apply(self, columns: Floats) -> Floats:
        """Rotate `columns`, shape (c, K), along the last axis."""
        turned = columns.copy()
        for rows, vectors in zip(self.members, self.vectors, strict=True):
            turned[:, rows] = np.einsum("bij,cbi->cbj", vectors, columns[:, rows])
        return turned

    def undo(self, columns: Floats) -> Floats:
        """Rotate back `columns`, shape (c, K)."""
        turned = columns.copy()
        for rows, vectors in zip(self.members, self.vectors, strict=True):
            turned[:, rows] = np.einsum("bji,cbi->cbj", vectors, columns[:, rows])
        return turned

    def undo_diagonal(self, values: Floats) -> Floats:
        """Diagonal, shape (K,), in the old axes of a matrix that is diag(values) in the new."""
        turned = values.copy()
        for rows, vectors in zip(self.members, self.vectors, strict=True):
            turned[rows] = np.einsum("bij,bj->bi", vectors**2, values[rows])
        return turned


def rotate(known: KnownCovariance, labels: Ints) -> Rotation:
    """Diagonalise V.

    Parameters
    ----------
    known : KnownCovariance
        Sampling covariance of K rows.
    labels : array of int, shape (K,)
        What to call each row in a refusal.

    Raises
    ------
    NotPositiveDefiniteError
        If a block has an eigenvalue below zero; names the pair of rows that breaks it.
    """
    variances = known.variances.copy()
    members, vectors = [], []
    for rows in _connected_rows(known):
        blocks = _blocks(known, rows)
        values, axes = np.linalg.eigh(blocks)
        _check_definite(values, axes, blocks, labels[rows])
        variances[rows] = np.where(values > _rounding(values), values, 0.0)
        members.append(rows)
        vectors.append(axes)
    return Rotation(tuple(members), tuple(vectors), variances)


def _connected_rows(known: KnownCovariance) -> Iterator[Ints]:
    """Row numbers of connected blocks of two and more rows, one array per block size."""
    linked = known.covariances != 0.0
    if not linked.any():
        return
    from scipy.sparse import coo_matrix  # 0.15 s that sheets without covariances never need
    from scipy.sparse.csgraph import connected_components

    total = len(known.variances)
    links = coo_matrix(
        (np.ones(int(linked.sum())), (known.rows_i[linked], known.rows_j[linked])),
        shape=(total, total),
    )
    _, block = connected_components(links, directed=False)
    order = np.argsort(block, kind="stable")
    sizes = np.bincount(block)
    size_of_row = sizes[block[order]]
    for size in np.unique(sizes[sizes > 1]):
        yield order[size_of_row == size].reshape(-1, size)


def _blocks(known: KnownCovariance, rows: Ints) -> Floats:
    count, size = rows.shape
    blocks = np.zeros((count, size, size))
    place = np.full((2, len(known.variances)), -1, dtype=np.intp)
    place[0, rows] = np.arange(count)[:, None]
    place[1, rows] = np.arange(size)
    inside = place[0, known.rows_i] >= 0
    i, j = known.rows_i[inside], known.rows_j[inside]
    which = place[0, i]
    blocks[which, place[1, i], place[1, j]] = known.covariances[inside]
    blocks[which, place[1, j], place[1, i]] = known.covariances[inside]
    diagonal = np.arange(size)
    blocks[:, diagonal, diagonal] = known.variances[rows]
    return blocks


def _rounding(values: Floats) -> Floats:
    """Size of rounding error in the eigenvalues of each block, shape (blocks, 1)."""
    size: Floats = ROUNDING * values.shape[1] * values[:, -1:]
    return size


def _check_definite(values: Floats, axes: Floats, blocks: Floats, labels: Ints) -> None:
    # eigh returns eigenvalues in ascending order
    negative = np.flatnonzero(values[:, 0] < -_rounding(values)[:, 0])
    if not len(negative):
        return
    worst = int(negative[np.argmin(values[negative, 0])])
    pair = labels[worst][_breaking_pair(blocks[worst], axes[worst, :, 0])]
    smallest = float(values[worst, 0])
    raise NotPositiveDefiniteError(
        "The known covariance is not positive definite: its smallest eigenvalue is "
        f"{smallest:.6g}, and rows {pair[0]} and {pair[1]} have a covariance too large for "
        "their variances.",
        smallest_eigenvalue=smallest,
        rows=(int(pair[0]), int(pair[1])),
    )


def _breaking_pair(block: Floats, vector: Floats) -> Ints:
    """The pair with the largest correlation above one, else the two heaviest in the eigenvector."""
    scale = np.sqrt(np.diag(block))
    correlation = np.abs(np.triu(block / np.outer(scale, scale), 1))
    if correlation.max() > 1.0:
        return np.array(np.unravel_index(correlation.argmax(), correlation.shape))
    return np.sort(np.argsort(-np.abs(vector))[:2])
