"""The statement of a mixed-model problem: rows, design, known covariance, levels."""

from collections.abc import Sequence
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import ArrayLike, NDArray

from drystone.maths.mixed_model.refuse import (
    InvalidProblemError,
    NonFiniteInputError,
    NonPositiveVarianceError,
    UnsupportedTermError,
)

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

STUDY = "study"
ROW = "row"
SCALE = "scale"
#: `scale` multiplies the whole known covariance by an estimated factor (Thompson & Sharp 1999).
SUPPORTED_TERMS = (STUDY, ROW, SCALE)


@dataclass(frozen=True)
class Term:
    """One source of heterogeneity.

    Parameters
    ----------
    name : str
        `study`, `row` or `scale`. Other names (crossed levels) are refused for now.
    index : array of int, shape (K,), optional
        Level of each row, for crossed levels. `study` and `row` need none.
    correlation : array, shape (q, q), optional
        Known correlation between the levels.
    """

    name: str
    index: Ints | None = None
    correlation: Floats | None = None


@dataclass(frozen=True)
class KnownCovariance:
    """The sampling covariance V: a diagonal plus single covariances within studies.

    Parameters
    ----------
    variances : array, shape (K,)
        Sampling variances (squared units of the response).
    rows_i, rows_j : array of int, shape (M,)
        Row numbers of each covariance, both in the same study; every pair once.
    covariances : array, shape (M,)
        The covariances, in the units of the variances.
    """

    variances: Floats
    rows_i: Ints = field(default_factory=lambda: np.empty(0, np.intp))
    rows_j: Ints = field(default_factory=lambda: np.empty(0, np.intp))
    covariances: Floats = field(default_factory=lambda: np.empty(0))

    def __post_init__(self) -> None:
        for name in ("variances", "covariances"):
            object.__setattr__(self, name, _floats(getattr(self, name), 1, name))
        for name in ("rows_i", "rows_j"):
            object.__setattr__(self, name, _codes(getattr(self, name), name))
        if not len(self.rows_i) == len(self.rows_j) == len(self.covariances):
            raise InvalidProblemError("Every covariance needs two row numbers and one value.")
        _check_variances(self.variances)
        _check_pairs(self)


@dataclass(frozen=True)
class Problem:
    """y = X b + sum_j Z_j u_j + e with e ~ N(0, V) known.

    Parameters
    ----------
    y : array, shape (K,)
        Responses (effects).
    X : array, shape (K, p)
        Design matrix.
    coefficient_names : sequence of str, length p
        One name per column of `X`.
    study : array of int, shape (K,)
        Study of each row; any integers.
    known : KnownCovariance
        Sampling covariance.
    terms : sequence of Term or str
        Levels of heterogeneity: any of `study`, `row`, `scale`, or none.

    Raises
    ------
    InvalidProblemError, NonFiniteInputError, UnsupportedTermError
    """

    y: Floats
    X: Floats
    coefficient_names: tuple[str, ...]
    study: Ints
    known: KnownCovariance
    terms: tuple[Term, ...] = (Term(STUDY), Term(ROW))

    def __post_init__(self) -> None:
        object.__setattr__(self, "y", _floats(self.y, 1, "y"))
        object.__setattr__(self, "X", _floats(self.X, 2, "X"))
        object.__setattr__(self, "study", _codes(self.study, "study"))
        object.__setattr__(self, "coefficient_names", tuple(self.coefficient_names))
        object.__setattr__(self, "terms", _terms(self.terms))
        _check_shapes(self)
        _check_same_study(self)

    def take(self, rows: ArrayLike) -> "Problem":
        """Return the problem of some rows only, such as all but one study.

        Parameters
        ----------
        rows : array of int or bool
            Row numbers to keep, each once, or a mask of shape (K,).
        """
        kept = np.arange(len(self.y))[np.asarray(rows)]
        place = np.full(len(self.y), -1, dtype=np.intp)
        place[kept] = np.arange(len(kept))
        known = self.known
        inside = (place[known.rows_i] >= 0) & (place[known.rows_j] >= 0)
        left = KnownCovariance(
            known.variances[kept],
            place[known.rows_i[inside]],
            place[known.rows_j[inside]],
            known.covariances[inside],
        )
        X, study = self.X[kept], self.study[kept]
        return Problem(self.y[kept], X, self.coefficient_names, study, left, self.terms)

    @property
    def term_names(self) -> tuple[str, ...]:
        """Names of the declared levels, in order."""
        return tuple(term.name for term in self.terms)


def _floats(values: ArrayLike, dimensions: int, name: str) -> Floats:
    array = np.array(values, dtype=np.float64)
    if array.ndim != dimensions:
        raise InvalidProblemError(f"{name} must have {dimensions} dimension(s), not {array.ndim}.")
    broken = np.argwhere(~np.isfinite(array))
    if len(broken):
        rows = sorted({int(place[0]) for place in broken})
        raise NonFiniteInputError(
            f"{name} has a value that is missing or infinite (first in row {rows[0]}).",
            array=name,
            rows=rows,
        )
    return array


def _codes(values: ArrayLike, name: str) -> Ints:
    array = np.asarray(values)
    if array.ndim != 1 or (array.size and array.dtype.kind not in "iu"):
        raise InvalidProblemError(f"{name} must be a one-dimensional array of whole numbers.")
    return array.astype(np.intp)


def _terms(terms: Sequence[Term | str]) -> tuple[Term, ...]:
    made = tuple(Term(term) if isinstance(term, str) else term for term in terms)
    names = [term.name for term in made]
    for term in made:
        if term.name not in SUPPORTED_TERMS or term.correlation is not None:
            raise UnsupportedTermError(
                f"The level '{term.name}' cannot be fitted by this engine; "
                f"it knows {', '.join(SUPPORTED_TERMS)}, without a known correlation.",
                term=term.name,
            )
    if len(set(names)) != len(names):
        raise InvalidProblemError("A level is declared twice.", terms=names)
    return made


def _check_shapes(problem: Problem) -> None:
    rows = len(problem.y)
    lengths = {
        "X": problem.X.shape[0],
        "study": len(problem.study),
        "variances": len(problem.known.variances),
    }
    for name, length in lengths.items():
        if length != rows:
            raise InvalidProblemError(f"{name} has {length} rows, y has {rows}.")
    if rows == 0 or problem.X.shape[1] == 0:
        raise InvalidProblemError("A model needs at least one row and one coefficient.")
    if len(problem.coefficient_names) != problem.X.shape[1]:
        raise InvalidProblemError("Every column of X needs one name.")


def _check_variances(variances: Floats) -> None:
    bad = np.flatnonzero(variances <= 0)
    if len(bad):
        first = int(bad[0])
        raise NonPositiveVarianceError(
            f"Row {first} has a sampling variance of {variances[first]:g}; "
            "a variance must be above zero.",
            rows=bad.tolist(),
        )


def _check_pairs(known: KnownCovariance) -> None:
    low, high = np.minimum(known.rows_i, known.rows_j), np.maximum(known.rows_i, known.rows_j)
    if not len(low):
        return
    if low.min() < 0 or high.max() >= len(known.variances):
        raise InvalidProblemError("A covariance names a row that does not exist.")
    if np.any(low == high):
        raise InvalidProblemError("A covariance names the same row twice; that is a variance.")
    pairs = low * len(known.variances) + high
    if len(np.unique(pairs)) != len(pairs):
        raise InvalidProblemError("A pair of rows has two covariances; state it once.")


def _check_same_study(problem: Problem) -> None:
    known = problem.known
    across = np.flatnonzero(problem.study[known.rows_i] != problem.study[known.rows_j])
    if len(across):
        pair = (int(known.rows_i[across[0]]), int(known.rows_j[across[0]]))
        raise InvalidProblemError(
            f"Rows {pair[0]} and {pair[1]} have a known covariance but different studies.",
            rows=pair,
        )
