"""Cluster-robust covariance of the coefficients with the CR2 adjustment and Satterthwaite df.

Bell & McCaffrey 2002 (Survey Methodology 28:169); Tipton 2015 (Psychol Methods 20:375,
doi 10.1037/met0000011); Pustejovsky & Tipton 2018 (J Bus Econ Stat 36:672,
doi 10.1080/07350015.2016.1247004). The working covariance is the fitted one.

Everything is invariant under the rotation of the rows, so the rotated axes are used throughout.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike
from scipy.linalg import solve_triangular

from drystone.maths.mixed_model.adjust_large import adjust_large
from drystone.maths.mixed_model.adjust_small import Levers, adjust_small
from drystone.maths.mixed_model.criterion import Evaluation, evaluate
from drystone.maths.mixed_model.fit import Fit
from drystone.maths.mixed_model.inference import Inference, contrast_rows, infer
from drystone.maths.mixed_model.joint import (
    JointTest,
    check_denominator,
    check_independent,
    f_test,
    wald_statistic,
)
from drystone.maths.mixed_model.moments import Moments, satterthwaite, wishart_degrees
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats, Ints
from drystone.maths.mixed_model.refuse import (
    ClustersCutStudiesError,
    InvalidProblemError,
    NoResidualsError,
    SingularCovarianceError,
    TooFewStudiesError,
)

#: Clusters up to this many rows are handled with dense matrices.
LARGEST_DENSE = 80
#: Residuals below this share of the largest response are rounding error.
ROUNDING = 1e-13
#: Matrix entries handled at a time.
CHUNK = 4_000_000


@dataclass(frozen=True)
class ClusterRobust:
    """CR2 covariance of the coefficients, and what the degrees of freedom need.

    Parameters
    ----------
    covariance : array, shape (p, p)
        CR2 covariance.
    degrees_of_freedom : array, shape (p,)
        Satterthwaite degrees of freedom of each coefficient.
    clusters : int
        Number of clusters J.
    """

    covariance: Floats
    degrees_of_freedom: Floats
    clusters: int
    _fit: Fit
    _triangle: Floats
    _moments: Moments

    @property
    def standard_errors(self) -> Floats:
        """Robust standard errors, shape (p,)."""
        return np.sqrt(np.diag(self.covariance))

    def satterthwaite(self, contrasts: ArrayLike) -> Floats:
        """Degrees of freedom, shape (c,), of contrast rows, shape (c, p)."""
        rows = np.atleast_2d(np.asarray(contrasts, dtype=np.float64))
        return np.array([satterthwaite(self._moments, row) for row in self._turn(rows)])

    def infer(
        self, contrasts: ArrayLike | None = None, confidence_percent: float = 95.0
    ) -> Inference:
        """Tests and intervals of the coefficients or of contrast rows, shape (c, p)."""
        names, rows = contrast_rows(self._fit, contrasts)
        errors = np.sqrt(np.einsum("ci,ij,cj->c", rows, self.covariance, rows))
        return infer(
            names,
            rows @ self._fit.coefficients,
            errors,
            self.satterthwaite(rows),
            confidence_percent,
            "cluster-robust standard error (CR2), t with Satterthwaite degrees of freedom",
        )

    def joint_test(self, contrasts: ArrayLike) -> JointTest:
        """Approximate Hotelling test that contrast rows, shape (q, p), are all zero.

        Tipton & Pustejovsky 2015 (J Educ Behav Stat 40:604, doi 10.3102/1076998615606099):
        F = (eta - q + 1) / (eta q) Q on q and eta - q + 1 degrees of freedom.
        """
        rows = contrast_rows(self._fit, contrasts)[1]
        check_independent(rows @ self._fit.covariance @ rows.T)
        eta, q = self.wishart_degrees(rows), len(rows)
        left = eta - q + 1.0 if self.clusters > q else 0.0
        check_denominator(q, left)
        wald = wald_statistic(rows @ self._fit.coefficients, rows @ self.covariance @ rows.T)
        method = "cluster-robust covariance (CR2), approximate Hotelling F"
        return f_test(wald * left / (eta * q), q, left, method)

    def wishart_degrees(self, contrasts: ArrayLike) -> float:
        """Degrees of freedom eta of the standardised covariance of contrast rows, (q, p)."""
        rows = np.atleast_2d(np.asarray(contrasts, dtype=np.float64))
        return wishart_degrees(self._moments, self._turn(rows))

    def _turn(self, rows: Floats) -> Floats:
        """Contrast rows in coordinates of the orthonormal basis."""
        turned: Floats = solve_triangular(self._triangle, rows.T, trans="T").T
        return turned


def cluster_robust(
    prepared: Prepared, fit: Fit, clusters: ArrayLike | None = None
) -> ClusterRobust:
    """CR2 covariance with the fitted model as the working model.

    Parameters
    ----------
    prepared, fit : Prepared, Fit
        The problem and its fit.
    clusters : array of int, shape (K,), optional
        Cluster of each row in the caller's order; the studies by default. Clusters must not cut
        through correlated rows.

    Raises
    ------
    ClustersCutStudiesError
        If the fitted covariance links rows of different clusters.
    TooFewStudiesError
        If there is only one cluster.
    NoResidualsError
        If every row lies exactly on its fitted value.
    """
    at = evaluate(prepared, fit.theta, fit.estimator)
    if at is None:
        raise SingularCovarianceError("The fitted covariance has no inverse.")
    codes = _codes(prepared, clusters)
    parts = _Parts.empty(int(codes.max()) + 1, prepared.width)
    bread = _bread(at)
    residual = prepared.response - at.coordinates @ prepared.basis
    _check_residuals(prepared, residual)
    for which, rows in _batches(codes):
        adjust = adjust_small if rows.shape[1] <= LARGEST_DENSE else adjust_large
        levers = adjust(prepared, at, bread, rows)
        parts.fill(which, levers, prepared.basis[:, rows], residual[rows])
    return _assemble(prepared, fit, bread, parts)


@dataclass(frozen=True)
class _Parts:
    """Per cluster: U' e, X' U and U' Phi U, where U = A W X M."""

    scores: Floats
    overlaps: Floats
    variances: Floats

    @staticmethod
    def empty(clusters: int, width: int) -> "_Parts":
        square = (clusters, width, width)
        return _Parts(np.empty((clusters, width)), np.empty(square), np.empty(square))

    def fill(self, which: Ints, levers: Levers, basis: Floats, residual: Floats) -> None:
        """Put in clusters of one size; `basis` is (p, b, n), `residual` is (b, n)."""
        self.scores[which] = np.einsum("bnp,bn->bp", levers.columns, residual)
        self.overlaps[which] = np.einsum("abn,bnp->bap", basis, levers.columns)
        self.variances[which] = levers.variances


def _bread(at: Evaluation) -> Floats:
    half = solve_triangular(at.factor, np.eye(len(at.factor)))
    return np.asarray(half @ half.T)


def _check_residuals(prepared: Prepared, residual: Floats) -> None:
    if np.abs(residual).max() <= ROUNDING * np.abs(prepared.problem.y).max():
        raise NoResidualsError(
            "Every row lies exactly on its fitted value, so the rows say nothing about "
            "standard errors of their own."
        )


def _codes(prepared: Prepared, clusters: ArrayLike | None) -> Ints:
    """Cluster of each sorted row, numbered from zero."""
    if clusters is None:
        codes = prepared.segment
    else:
        given = np.asarray(clusters)
        if given.shape != (prepared.rows,):
            raise InvalidProblemError("Every row needs one cluster.")
        codes = np.unique(given[prepared.order], return_inverse=True)[1]
        _check_uncut(prepared, codes)
    if codes.max() == 0:
        raise TooFewStudiesError("Cluster-robust inference needs at least two clusters.")
    return codes


def _check_uncut(prepared: Prepared, codes: Ints) -> None:
    blocks = list(prepared.rotation.members)
    cut = any(np.any(codes[rows] != codes[rows[:, :1]]) for rows in blocks)
    if prepared.study_term is not None:
        first = codes[prepared.starts][prepared.segment]
        cut = cut or bool(np.any(codes != first))
    if cut:
        raise ClustersCutStudiesError(
            "The clusters cut through rows that the model holds to be correlated; "
            "a cluster must contain whole studies."
        )


def _batches(codes: Ints) -> Iterator[tuple[Ints, Ints]]:
    """Clusters of one size together: their numbers and their rows, shape (clusters, size)."""
    order = np.argsort(codes, kind="stable")
    sizes = np.bincount(codes)
    size_of_row = sizes[codes[order]]
    for size in np.unique(sizes):
        which = np.flatnonzero(sizes == size)
        rows = order[size_of_row == size].reshape(-1, size)
        step = max(1, CHUNK // int(size) ** 2)
        for k in range(0, len(which), step):
            yield which[k : k + step], rows[k : k + step]


def _assemble(prepared: Prepared, fit: Fit, bread: Floats, parts: _Parts) -> ClusterRobust:
    inner = parts.scores.T @ parts.scores
    outer = prepared.coefficients(prepared.coefficients(inner).T)
    made = ClusterRobust(
        covariance=outer,
        degrees_of_freedom=np.empty(0),
        clusters=len(parts.scores),
        _fit=fit,
        _triangle=prepared.triangle,
        _moments=Moments(bread, parts.overlaps, parts.variances),
    )
    degrees = made.satterthwaite(np.eye(prepared.width))
    object.__setattr__(made, "degrees_of_freedom", degrees)
    return made
