"""Everything about a problem that does not change with the components: sort, rotate, factor."""

from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np
from numpy.typing import ArrayLike
from scipy.linalg import qr, solve_triangular

from drystone.maths.mixed_model.problem import (
    ROW,
    SCALE,
    STUDY,
    Floats,
    Ints,
    KnownCovariance,
    Problem,
)
from drystone.maths.mixed_model.refuse import (
    RankDeficientDesignError,
    SingleStudyError,
    TooFewRowsError,
    TooFewStudiesError,
    counted,
)
from drystone.maths.mixed_model.rotate import Rotation, rotate

#: A column is called dependent when less than this share of it is left beside the others.
DEPENDENT = 1e-12


@dataclass(frozen=True)
class Prepared:
    """A problem sorted by study, rotated and orthonormalised; reusable for every fit.

    Arrays with a row axis are in sorted, rotated order (shape (K,) or (c, K)).

    Parameters
    ----------
    problem : Problem
        The statement, in the caller's row order.
    order : array of int, shape (K,)
        Caller's row number of each sorted row.
    starts : array of int, shape (J,)
        First sorted row of each study.
    segment : array of int, shape (K,)
        Position of the study of each sorted row.
    rotation : Rotation
        Axes in which V is diagonal.
    ones : array, shape (K,)
        Rotated study indicator z (a one per row, before the rotation).
    basis : array, shape (p, K)
        Rotated orthonormal basis of the columns of X.
    triangle : array, shape (p, p)
        R of X = basis' R.
    response : array, shape (K,)
        Rotated y with its least-squares part removed, which protects digits.
    offset : array, shape (p,)
        The part removed, in coordinates of the basis.
    base, slopes : array (K,) and array (d, K)
        The diagonal is base + sum of component x slope, over `diagonal_terms`.
    """

    problem: Problem
    order: Ints
    starts: Ints
    segment: Ints
    rotation: Rotation
    ones: Floats
    basis: Floats
    triangle: Floats
    response: Floats
    offset: Floats
    base: Floats
    slopes: Floats

    @cached_property
    def term_names(self) -> tuple[str, ...]:
        """Names of the levels, in the order of every vector of components."""
        return self.problem.term_names

    @cached_property
    def diagonal_terms(self) -> tuple[int, ...]:
        """Positions of the levels that act on the diagonal."""
        return tuple(k for k, name in enumerate(self.term_names) if name != STUDY)

    @cached_property
    def study_term(self) -> int | None:
        """Position of the study level, if declared."""
        return self.term_names.index(STUDY) if STUDY in self.term_names else None

    @property
    def rows(self) -> int:
        """Number of rows K."""
        return len(self.order)

    @property
    def studies(self) -> int:
        """Number of studies J."""
        return len(self.starts)

    @property
    def width(self) -> int:
        """Number of coefficients p."""
        return len(self.triangle)

    def sum_by_study(self, values: Floats) -> Floats:
        """Sum over the rows of each study along the last axis."""
        return np.add.reduceat(values, self.starts, axis=-1)

    def coefficients(self, coordinates: Floats) -> Floats:
        """Coefficients of X from coordinates in the basis, shape (p,) or (p, c)."""
        solved: Floats = solve_triangular(self.triangle, coordinates)
        return solved

    def with_response(self, y: ArrayLike) -> "Prepared":
        """Return the same preparation for other responses `y`, shape (K,), in caller's order."""
        problem = replace(self.problem, y=np.asarray(y, dtype=np.float64))
        response, offset = _centre(self.rotation.apply(problem.y[None, self.order])[0], self.basis)
        return replace(self, problem=problem, response=response, offset=offset)


def prepare(problem: Problem) -> Prepared:
    """Sort by study, rotate to diagonal V and orthonormalise the design.

    Parameters
    ----------
    problem : Problem
        The statement.

    Returns
    -------
    Prepared
        Reusable for REML and ML, starts, profiles and bootstraps.

    Raises
    ------
    TooFewRowsError, TooFewStudiesError, SingleStudyError, RankDeficientDesignError
        If the coefficients or levels cannot be carried by the rows.
    NotPositiveDefiniteError
        If V is not a covariance matrix.
    """
    order = np.argsort(problem.study, kind="stable")
    _, starts, segment = np.unique(problem.study[order], return_index=True, return_inverse=True)
    _check_counts(problem, len(starts))
    rotation = rotate(_sorted_known(problem.known, order), order)
    basis, triangle = _orthonormalise(problem)
    turned = rotation.apply(np.vstack([basis[:, order], np.ones(len(order)), problem.y[order]]))
    turned_basis = np.ascontiguousarray(turned[:-2])
    response, offset = _centre(turned[-1], turned_basis)
    base, slopes = _diagonal(problem, rotation.variances)
    return Prepared(
        problem=problem,
        order=order,
        starts=starts,
        segment=segment,
        rotation=rotation,
        ones=turned[-2],
        basis=turned_basis,
        triangle=triangle,
        response=response,
        offset=offset,
        base=base,
        slopes=slopes,
    )


def _check_counts(problem: Problem, studies: int) -> None:
    rows, width = problem.X.shape
    if rows <= width:
        raise TooFewRowsError(
            f"{counted(rows, 'row')} cannot carry {counted(width, 'coefficient')} and a variance.",
            rows=rows,
            coefficients=width,
        )
    if STUDY not in problem.term_names:
        return
    if studies == 1:
        raise SingleStudyError("There is only one study, so differences between studies are void.")
    if studies <= width:
        raise TooFewStudiesError(
            f"{counted(studies, 'study', 'studies')} cannot carry "
            f"{counted(width, 'coefficient')} beside a study level.",
            studies=studies,
            coefficients=width,
        )


def _sorted_known(known: KnownCovariance, order: Ints) -> KnownCovariance:
    place = np.empty_like(order)
    place[order] = np.arange(len(order))
    return KnownCovariance(
        known.variances[order], place[known.rows_i], place[known.rows_j], known.covariances
    )


def _orthonormalise(problem: Problem) -> tuple[Floats, Floats]:
    """Return the basis, shape (p, K), and the triangle of X, or refuse dependent columns."""
    lengths = np.linalg.norm(problem.X, axis=0)
    dependent = np.flatnonzero(lengths == 0.0)
    if not len(dependent):
        dependent = _dependent_columns(problem.X / lengths)
    if len(dependent):
        names = [problem.coefficient_names[k] for k in dependent]
        raise RankDeficientDesignError(
            f"The coefficients {', '.join(names)} cannot be told apart: "
            "their columns are zero or sums of each other.",
            columns=names,
        )
    basis, triangle = np.linalg.qr(problem.X)
    return np.ascontiguousarray(basis.T), triangle


def _dependent_columns(X: Floats) -> Ints:
    """Columns (of unit length) that take part in an exact linear relation."""
    triangle, pivots = qr(X, mode="r", pivoting=True)
    left = np.abs(np.diag(triangle))
    rank = int(np.sum(left > DEPENDENT))
    if rank == X.shape[1]:
        return np.empty(0, dtype=np.intp)
    weights = solve_triangular(triangle[:rank, :rank], triangle[:rank, rank:])
    involved = np.any(np.abs(weights) > 1e-8, axis=1)
    return np.sort(np.concatenate([pivots[:rank][involved], pivots[rank:]]))


def _centre(response: Floats, basis: Floats) -> tuple[Floats, Floats]:
    offset = basis @ response
    rest = response - offset @ basis
    again = basis @ rest  # a second pass leaves nothing but rounding error along the basis
    return rest - again @ basis, offset + again


def _diagonal(problem: Problem, variances: Floats) -> tuple[Floats, Floats]:
    names = [name for name in problem.term_names if name != STUDY]
    slopes = np.empty((len(names), len(variances)))
    for k, name in enumerate(names):
        slopes[k] = 1.0 if name == ROW else variances
    base = np.zeros_like(variances) if SCALE in names else variances
    return base, slopes
