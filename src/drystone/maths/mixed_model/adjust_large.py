"""The CR2 adjustment of large clusters without any matrix of their size.

The lever of a cluster is U = (Phi C)^(-1/2) X M with C = Phi - X M X' (own derivation, from
A C A = Phi). The inverse root is a sum over N nodes t of (Phi C + t^2)^-1, whose error falls
like exp(-2 pi^2 N / (ln(condition) + 3)) (Hale, Higham & Trefethen 2008, SIAM J Numer Anal
46:2505). Each term needs only (Phi - i t)^-1 X, which is cheap because Phi is a diagonal plus one
column per study, and a p x p system. A cluster of n rows costs O(n p^2 N).

Directions that the cluster owns alone (singular C) are lifted out by a rank-one term each and
taken off again afterwards.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.linalg import solve_triangular
from scipy.special import ellipkm1

from drystone.maths.mixed_model.adjust_small import OWNED, Levers
from drystone.maths.mixed_model.criterion import Evaluation
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats, Ints

Complex = NDArray[np.complex128]

QUADRATURE_ERROR = 1e-15


@dataclass(frozen=True)
class _Cluster:
    """One cluster: Phi = diag(m) + s sum over studies of z z'."""

    diagonal: Floats
    between: float
    ones: Floats
    segment: Ints
    starts: Ints
    design: Floats

    def solve(self, shift: complex, columns: Floats | Complex) -> Complex:
        """Return (Phi + shift)^-1 columns, shape (n, c)."""
        inverse = (1.0 / (self.diagonal + shift))[:, None]
        pulled = self.ones[:, None] * inverse
        mass = np.add.reduceat(self.ones[:, None] * pulled, self.starts)
        centre = np.add.reduceat(pulled * columns, self.starts) / mass
        within = columns - self.ones[:, None] * centre[self.segment]
        shrunk = centre / (1.0 + self.between * mass)
        return np.asarray(within * inverse + pulled * shrunk[self.segment])

    def quadratic(self, columns: Floats) -> Floats:
        """Return columns' Phi columns."""
        sums = np.add.reduceat(self.ones[:, None] * columns, self.starts)
        made: Floats = columns.T @ (self.diagonal[:, None] * columns) + self.between * sums.T @ sums
        return made

    @property
    def largest(self) -> float:
        """Upper bound of the eigenvalues of Phi."""
        sums = np.add.reduceat(self.ones**2, self.starts)
        return float(self.diagonal.max() + self.between * sums.max())


def adjust_large(prepared: Prepared, at: Evaluation, bread: Floats, rows: Ints) -> Levers:
    """Levers of the clusters whose rows are `rows`, shape (b, n)."""
    both = [_adjust(_take(prepared, at, own), at, bread) for own in rows]
    return Levers(np.stack([u for u, _ in both]), np.stack([v for _, v in both]))


def _take(prepared: Prepared, at: Evaluation, rows: Ints) -> _Cluster:
    _, starts, segment = np.unique(prepared.segment[rows], return_index=True, return_inverse=True)
    return _Cluster(
        diagonal=1.0 / at.weights.precision[rows],
        between=at.weights.between_variance,
        ones=prepared.ones[rows],
        segment=segment,
        starts=starts,
        design=prepared.basis[:, rows].T,
    )


def _adjust(cluster: _Cluster, at: Evaluation, bread: Floats) -> tuple[Floats, Floats]:
    inverse = solve_triangular(at.factor, np.eye(len(bread)))
    pulled = cluster.solve(0.0, cluster.design).real
    share, axes = np.linalg.eigh(inverse.T @ (cluster.design.T @ pulled) @ inverse)
    owned = 1.0 - share <= OWNED
    null = _normalised(cluster, pulled @ (inverse @ axes[:, owned]))
    lift = float(np.median(cluster.diagonal)) ** 2
    rest = float(np.min(1.0 - share[~owned], initial=1.0))
    low = min(float(cluster.diagonal.min()) ** 2 * rest, lift)
    high = max(cluster.largest**2, lift)
    columns = _inverse_root(cluster, bread, null, lift, low, high)
    taken = cluster.solve(0.0, null).real.T @ (cluster.design @ bread)
    columns = columns - null @ taken / np.sqrt(lift)
    return columns, cluster.quadratic(columns)


def _normalised(cluster: _Cluster, null: Floats) -> Floats:
    """Scale null directions so that null' Phi^-1 null = I."""
    if null.shape[1] == 0:
        return null
    gram = null.T @ cluster.solve(0.0, null).real
    root = np.linalg.cholesky((gram + gram.T) / 2.0)
    return np.asarray(solve_triangular(root, null.T, lower=True).T)


def _inverse_root(
    cluster: _Cluster, bread: Floats, null: Floats, lift: float, low: float, high: float
) -> Floats:
    """(Phi C + lift null null' Phi^-1)^(-1/2) X M by quadrature; eigenvalues in [low, high]."""
    width = len(bread)
    both = np.hstack([cluster.design, null])
    right = np.hstack([cluster.design @ bread, -lift * cluster.solve(0.0, null).real])
    total = np.zeros_like(cluster.design)
    for node, weight in zip(*_nodes(low / high), strict=True):
        shift = node * np.sqrt(low)
        solved = cluster.solve(-1j * shift, both)
        inner = solved.imag / shift  # (Phi^2 + t^2)^-1 [X, null]
        left = np.hstack([solved.real[:, :width], inner[:, width:]])
        start = inner[:, :width] @ bread
        system = np.eye(left.shape[1]) - right.T @ left
        total += weight * (start + left @ np.linalg.solve(system, right.T @ start))
    scaled: Floats = total * np.sqrt(low)
    return scaled


def _nodes(ratio: float) -> tuple[Floats, Floats]:
    """Nodes t and weights w with sum w / (x + t^2) = x^(-1/2) for x from 1 to 1 / ratio.

    t = sn/cn and w ~ dn/cn^2 at midpoints of the quarter period of the complementary modulus;
    the elliptic functions come from the arithmetic-geometric mean (Abramowitz & Stegun 16.4), the
    upper half of the nodes from the lower one by reflection, which keeps their digits.
    """
    count = int(np.ceil(-np.log(QUADRATURE_ERROR) * (3.0 - np.log(ratio)) / (2.0 * np.pi**2)))
    count += count % 2
    period = float(ellipkm1(ratio))
    phase = _amplitude((np.arange(count // 2) + 0.5) * period / count, ratio)
    sine, cosine = np.sin(phase), np.cos(phase)
    delta = np.sqrt(cosine**2 + ratio * sine**2)
    low = sine / cosine, delta / cosine**2
    high = cosine / sine / np.sqrt(ratio), delta / sine**2 / np.sqrt(ratio)
    weights = np.concatenate([low[1], high[1]]) * 2.0 * period / (np.pi * count)
    return np.concatenate([low[0], high[0]]), weights


def _amplitude(argument: Floats, ratio: float) -> Floats:
    """Jacobi's amplitude for the parameter 1 - ratio, for arguments up to half a period."""
    means, differences, other = [1.0], [np.sqrt(1.0 - ratio)], np.sqrt(ratio)
    while abs(differences[-1]) > np.finfo(float).eps / 10.0 and len(means) < 20:
        differences.append((means[-1] - other) / 2.0)
        means.append((means[-1] + other) / 2.0)
        other = np.sqrt(other * means[-2])
    phase = 2.0 ** (len(means) - 1) * means[-1] * argument
    for mean, difference in zip(means[:0:-1], differences[:0:-1], strict=True):
        phase = (np.arcsin(difference * np.sin(phase) / mean) + phase) / 2.0
    return phase
