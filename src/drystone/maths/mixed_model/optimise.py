"""Search for the maximum: average-information Newton with an active set at zero.

Far from the maximum the average information bends the steps (Gilmour, Thompson & Cullis 1995),
damped after Levenberg and Marquardt; near it the exact second derivatives take over, so that the
last steps square the error. A component that the quadratic model sends below zero is set to an
exact zero and stays there while its score is not positive: that is the certificate.
"""

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from drystone.maths.mixed_model.criterion import Estimator, Evaluation, evaluate
from drystone.maths.mixed_model.derivatives import Slope, expected_information, slope
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats

Flags = NDArray[np.bool_]

#: A search has converged when every free score is this small beside its two parts.
CONVERGED = 1e-9
#: Where the exact second derivatives take over.
NEAR = 1e-2
#: Below this no digit is left to win.
POLISHED = 1e-15
MOST_STEPS = 200
MOST_DAMPING = 1e12


@dataclass(frozen=True)
class Point:
    """One place of the search."""

    at: Evaluation
    slope: Slope
    imbalance: float

    @property
    def value(self) -> float:
        """Log-likelihood here."""
        return self.at.log_likelihood


@dataclass(frozen=True)
class Path:
    """Where a search ended and how many steps it took."""

    end: Point
    steps: int

    @property
    def converged(self) -> bool:
        """Whether the scores certify a maximum."""
        return self.end.imbalance <= CONVERGED


def maximise(
    prepared: Prepared, estimator: Estimator, start: Floats, held: Flags | None = None
) -> Path | None:
    """Climb from `start`.

    Parameters
    ----------
    prepared : Prepared
        The problem.
    estimator : {"REML", "ML"}
        Which likelihood.
    start : array, shape (q,)
        First components.
    held : array of bool, shape (q,), optional
        Components that stay at their start.

    Returns
    -------
    Path or None
        None if the covariance has no inverse at the start.
    """
    fixed = np.zeros(len(start), dtype=bool) if held is None else held
    here = _look(prepared, estimator, start, fixed)
    if here is None:
        return None
    damping = 1e-3
    for step in range(MOST_STEPS):
        if here.imbalance <= POLISHED:
            return Path(here, step)
        curvature = _curvature(prepared, estimator, here, fixed)
        moved, damping = _advance(prepared, estimator, here, curvature, fixed, damping)
        if moved is None:
            return Path(here, step + 1)
        here = moved
    return Path(here, MOST_STEPS)


def _look(prepared: Prepared, estimator: Estimator, theta: Floats, held: Flags) -> Point | None:
    at = evaluate(prepared, theta, estimator)
    if at is None or not np.isfinite(at.log_likelihood):
        return None
    here = slope(prepared, at, estimator)
    counted = ~(held | _resting(theta, here.score))
    return Point(at, here, float(np.abs(here.imbalance()[counted]).max(initial=0.0)))


def _resting(theta: Floats, score: Floats) -> Flags:
    return (theta <= 0.0) & (score <= 0.0)


def _curvature(prepared: Prepared, estimator: Estimator, here: Point, held: Flags) -> Floats:
    """Observed information where it is near and positive definite, else the average one."""
    average = here.slope.average
    free = ~(held | _resting(here.at.theta, here.slope.score))
    if here.imbalance <= NEAR:
        observed: Floats = 2.0 * average - expected_information(prepared, here.at, estimator)
        if np.all(np.linalg.eigvalsh(_scaled(observed[np.ix_(free, free)])) > 1e-6):
            return observed
    # tr(PGPG) >= tr(PG)^2 / (n - p): a floor for the rare case of a vanishing average
    floor = 1e-6 * 2.0 * here.slope.half_traces**2 / (prepared.rows - prepared.width)
    lifted: Floats = average + np.diag(np.maximum(floor - np.diag(average), 0.0))
    return lifted


def _scaled(matrix: Floats) -> Floats:
    size = np.sqrt(np.maximum(np.diag(matrix), 0.0))
    if not size.all():
        return np.full((1, 1), -1.0)
    scaled: Floats = matrix / np.outer(size, size)
    return scaled


def _advance(
    prepared: Prepared,
    estimator: Estimator,
    here: Point,
    curvature: Floats,
    held: Flags,
    damping: float,
) -> tuple[Point | None, float]:
    """One accepted step with the next damping, or None when no step improves."""
    near = here.imbalance <= NEAR
    trial = 0.0 if near else damping
    while trial <= MOST_DAMPING:
        bent = curvature + trial * np.diag(np.diag(curvature))
        theta = _bounded_step(here.at.theta, here.slope.score, bent, held)
        if theta is None or np.array_equal(theta, here.at.theta):
            return None, damping
        there = _look(prepared, estimator, theta, held)
        if there is not None and _better(here, there):
            return there, trial / 10.0
        trial = max(10.0 * trial, 1e-3)
    return None, damping


def _better(here: Point, there: Point) -> bool:
    # differences below the rounding error of the sum decide nothing; the scores do
    blur = 1e-12 * (1.0 + abs(here.value))
    gain = there.value - here.value
    if gain > blur:
        return True
    return gain >= -blur and there.imbalance < 0.9 * here.imbalance


def _bounded_step(theta: Floats, score: Floats, curvature: Floats, held: Flags) -> Floats | None:
    """Maximum of the quadratic model over components of zero and above."""
    target = theta.copy()
    active = held | _resting(theta, score)
    for _ in range(len(theta) + 1):
        free = ~active
        if not free.any():
            return target
        moved = target - theta
        pull = score[free] - curvature[np.ix_(free, active)] @ moved[active]
        try:
            target[free] = theta[free] + np.linalg.solve(curvature[np.ix_(free, free)], pull)
        except np.linalg.LinAlgError:
            return None
        below = free & (target < 0.0)
        if not below.any():
            return target
        target[below] = 0.0
        active = active | below
    return target
