"""Fit a mixed model: starts, search, refusals and the certificate."""

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field

import numpy as np
from scipy.linalg import solve_triangular

from drystone.maths.mixed_model.criterion import Estimator
from drystone.maths.mixed_model.derivatives import expected_information
from drystone.maths.mixed_model.identify import check_bounded, check_identified, invert_information
from drystone.maths.mixed_model.optimise import Path, maximise
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import SCALE, Floats
from drystone.maths.mixed_model.refuse import (
    InvalidProblemError,
    NotConvergedError,
    SingularCovarianceError,
)
from drystone.maths.mixed_model.starts import distinct, own_starts

CONVENTIONS: dict[Estimator, str] = {
    "REML": "-(n-p)/2 ln(2 pi) - ln|S|/2 - ln|X'S^-1 X|/2 + ln|X'X|/2 - r'S^-1 r/2",
    "ML": "-n/2 ln(2 pi) - ln|S|/2 - r'S^-1 r/2",
}
#: Ends whose log-likelihoods differ by less than this are the same maximum.
SAME_END = 1e-6


@dataclass(frozen=True)
class Certificate:
    """How the maximum was found.

    Parameters
    ----------
    converged : bool
        Whether every free score is zero up to rounding and every resting one is not positive.
    gradient_norm : float
        Largest free score, relative to the two parts that cancel in it.
    iterations : int
        Steps of the search that was kept.
    starts : int
        Searches that were run.
    starts_agree : bool
        Whether all of them ended at the same log-likelihood (within 1e-6).
    ends : tuple of float
        Log-likelihood at the end of each search.
    """

    converged: bool
    gradient_norm: float
    iterations: int
    starts: int
    starts_agree: bool
    ends: tuple[float, ...]


@dataclass(frozen=True)
class Fit:
    """A fitted model.

    Parameters
    ----------
    estimator : {"REML", "ML"}
        Which likelihood was maximised.
    coefficient_names : tuple of str
        Names of the coefficients.
    coefficients : array, shape (p,)
        Generalised least-squares coefficients.
    covariance : array, shape (p, p)
        Model-based covariance of the coefficients, inverse(X' inverse(Sigma) X).
    components : dict of str to float
        Variance of each level (and the factor of V, for `scale`).
    at_zero : dict of str to bool
        Whether a component rests at exactly zero.
    scores : dict of str to float
        Derivative of the log-likelihood at the solution; zero or below where at zero.
    component_covariance : array, shape (q, q)
        Inverse observed information; NaN for components at zero or held.
    log_likelihood : float
        Value at the maximum, with all constants.
    convention : str
        The formula of the log-likelihood.
    certificate : Certificate
        How the maximum was found.
    rows, studies : int
        Rows K and studies J.
    held : tuple of str
        Levels whose component was given, not estimated.
    theta : array, shape (q,)
        The components as a vector, in the order of the terms.
    """

    estimator: Estimator
    coefficient_names: tuple[str, ...]
    coefficients: Floats
    covariance: Floats
    components: dict[str, float]
    at_zero: dict[str, bool]
    scores: dict[str, float]
    component_covariance: Floats
    log_likelihood: float
    convention: str
    certificate: Certificate
    rows: int
    studies: int
    held: tuple[str, ...] = ()
    theta: Floats = field(default_factory=lambda: np.empty(0), repr=False)

    @property
    def standard_errors(self) -> Floats:
        """Model-based standard errors of the coefficients, shape (p,)."""
        return np.sqrt(np.diag(self.covariance))

    @property
    def heterogeneity(self) -> float:
        """Sum of the level variances (without the factor of V)."""
        return sum(value for name, value in self.components.items() if name != SCALE)


def fit(
    prepared: Prepared,
    estimator: Estimator = "REML",
    held: Mapping[str, float] | None = None,
    starts: Sequence[Mapping[str, float]] = (),
) -> Fit:
    """Maximise the likelihood over the components.

    Parameters
    ----------
    prepared : Prepared
        The problem.
    estimator : {"REML", "ML"}
        Which likelihood.
    held : mapping of str to float, optional
        Components to keep at a given value.
    starts : sequence of mappings, optional
        Where to start, instead of the engine's own starts. One start from the fit of nearly the
        same rows (a study left out, a replicate) saves most of the time.

    Returns
    -------
    Fit
        The best end of all searches.

    Raises
    ------
    LevelsIndistinguishableError, FlatLikelihoodError
        If the levels cannot be estimated from these rows.
    SingularCovarianceError
        If the covariance has no inverse at any start.
    NotConvergedError
        If no search ended at a maximum.
    """
    kept = dict(held or {})
    _check_held(prepared, kept)
    check_identified(prepared)
    check_bounded(prepared, estimator)
    fixed = np.array([name in kept for name in prepared.term_names], dtype=bool)
    chosen = [_vector(prepared, start) for start in starts] or own_starts(prepared)
    for start in chosen:
        start[fixed] = [kept[name] for name in prepared.term_names if name in kept]
    paths = [maximise(prepared, estimator, start, fixed) for start in distinct(chosen)]
    return _report(prepared, estimator, [path for path in paths if path is not None], fixed)


def _check_held(prepared: Prepared, held: Mapping[str, float]) -> None:
    for name, value in held.items():
        if name not in prepared.term_names or not (np.isfinite(value) and value >= 0.0):
            raise InvalidProblemError(f"The level '{name}' cannot be held at {value}.")


def _vector(prepared: Prepared, components: Mapping[str, float]) -> Floats:
    if set(components) != set(prepared.term_names):
        raise InvalidProblemError(f"A start needs a value of each of {prepared.term_names}.")
    made = np.array([components[name] for name in prepared.term_names], dtype=np.float64)
    if not (np.isfinite(made).all() and (made >= 0.0).all()):
        raise InvalidProblemError("A start cannot be negative or missing.")
    return made


def _report(prepared: Prepared, estimator: Estimator, paths: list[Path], held: np.ndarray) -> Fit:
    if not paths:
        raise SingularCovarianceError(
            "The covariance of the rows has no inverse: some rows are perfectly correlated "
            "and no row level separates them."
        )
    best = max(paths, key=lambda path: (path.converged, path.end.value))
    if not best.converged:
        raise NotConvergedError(
            "The search for the components did not end at a maximum "
            f"(relative score {best.end.imbalance:.2g} after {best.steps} steps).",
            gradient_norm=best.end.imbalance,
            steps=best.steps,
        )
    return _make(prepared, estimator, best, _certify(best, paths), held)


def _certify(best: Path, paths: list[Path]) -> Certificate:
    ends = tuple(path.end.value for path in paths)
    return Certificate(
        converged=best.converged,
        gradient_norm=best.end.imbalance,
        iterations=best.steps,
        starts=len(paths),
        starts_agree=max(ends) - min(ends) <= SAME_END,
        ends=ends,
    )


def _make(
    prepared: Prepared, estimator: Estimator, best: Path, certificate: Certificate, held: np.ndarray
) -> Fit:
    names, at, score = prepared.term_names, best.end.at, best.end.slope.score
    half = prepared.coefficients(solve_triangular(at.factor, np.eye(prepared.width)))
    return Fit(
        estimator=estimator,
        coefficient_names=prepared.problem.coefficient_names,
        coefficients=prepared.coefficients(at.coordinates + prepared.offset),
        covariance=half @ half.T,
        components=dict(zip(names, at.theta.tolist(), strict=True)),
        at_zero=dict(zip(names, (at.theta <= 0.0).tolist(), strict=True)),
        scores=dict(zip(names, score.tolist(), strict=True)),
        component_covariance=_component_covariance(prepared, estimator, best, held),
        log_likelihood=at.log_likelihood,
        convention=CONVENTIONS[estimator],
        certificate=certificate,
        rows=prepared.rows,
        studies=prepared.studies,
        held=tuple(name for name, kept in zip(names, held, strict=True) if kept),
        theta=at.theta,
    )


def _component_covariance(
    prepared: Prepared, estimator: Estimator, best: Path, held: np.ndarray
) -> Floats:
    at = best.end.at
    observed = 2.0 * best.end.slope.average - expected_information(prepared, at, estimator)
    free = np.flatnonzero(~held & (at.theta > 0.0))
    made = np.full_like(observed, np.nan)
    if len(free):
        names = [prepared.term_names[k] for k in free]
        made[np.ix_(free, free)] = invert_information(observed[np.ix_(free, free)], names)
    return made
