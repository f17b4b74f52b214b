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
STRETCHES = 10.0 ** np.arange(1, 13)


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
    search = _Search(prepared, estimator, fixed)
    here = search.look(start)
    if here is None:
        return None
    damping = 1e-3
    for step in range(MOST_STEPS):
        if here.imbalance <= POLISHED:
            return Path(here, step)
        moved, damping = search.advance(here, damping)
        if moved is None:
            return Path(here, step + 1)
        here = moved
    return Path(here, MOST_STEPS)


@dataclass(frozen=True)
class _Search:
    """What stays the same while a search climbs."""

    prepared: Prepared
    estimator: Estimator
    held: Flags

    def look(self, theta: Floats) -> Point | None:
        """Evaluate at `theta`; None where the covariance has no inverse."""
        at = evaluate(self.prepared, theta, self.estimator)
        if at is None or not np.isfinite(at.log_likelihood):
            return None
        here = slope(self.prepared, at, self.estimator)
        counted = ~(self.held | _resting(theta, here.score))
        return Point(at, here, float(np.abs(here.imbalance()[counted]).max(initial=0.0)))

    def advance(self, here: Point, damping: float) -> tuple[Point | None, float]:
        """One accepted step with the next damping, or None when no step improves."""
        curvature = self.curvature(here)
        trial = 0.0 if here.imbalance <= NEAR else damping
        while trial <= MOST_DAMPING:
            there = self.step(here, curvature + trial * np.diag(np.diag(curvature)))
            if there is not None and _better(here, there):
                return there, trial / 10.0
            trial = max(10.0 * trial, 1e-3)
        if here.imbalance > CONVERGED:
            return self.stretch(here, curvature), damping
        return None, damping

    def stretch(self, here: Point, curvature: Floats) -> Point | None:
        """Leave a place where the likelihood bends upwards and short steps gain only rounding."""
        for factor in STRETCHES:
            there = self.step(here, curvature / factor)
            if there is not None and there.value - here.value > _blur(here):
                return there
        return None

    def step(self, here: Point, curvature: Floats) -> Point | None:
        """Evaluate at the maximum of the quadratic model."""
        theta = _bounded_step(here.at.theta, here.slope.score, curvature, self.held)
        if theta is None or np.array_equal(theta, here.at.theta):
            return None
        return self.look(theta)

    def curvature(self, here: Point) -> Floats:
        """Observed information where it is near and positive definite, else the average one."""
        average = here.slope.average
        free = ~(self.held | _resting(here.at.theta, here.slope.score))
        if here.imbalance <= NEAR:
            expected = expected_information(self.prepared, here.at, self.estimator)
            observed: Floats = 2.0 * average - expected
            if np.all(np.linalg.eigvalsh(_scaled(observed[np.ix_(free, free)])) > 1e-6):
                return observed
        # tr(PGPG) >= tr(PG)^2 / (n - p): a floor for the rare case of a vanishing average
        floor = 2e-6 * here.slope.half_traces**2 / (self.prepared.rows - self.prepared.width)
        lifted: Floats = average + np.diag(np.maximum(floor - np.diag(average), 0.0))
        return lifted


def _resting(theta: Floats, score: Floats) -> Flags:
    return (theta <= 0.0) & (score <= 0.0)


def _scaled(matrix: Floats) -> Floats:
    size = np.sqrt(np.maximum(np.diag(matrix), 0.0))
    if not size.all():
        return np.full((1, 1), -1.0)
    scaled: Floats = matrix / np.outer(size, size)
    return scaled


def _better(here: Point, there: Point) -> bool:
    # differences below the rounding error of the sum decide nothing; the scores do
    gain = there.value - here.value
    if gain > _blur(here):
        return True
    return gain >= -_blur(here) and there.imbalance < 0.9 * here.imbalance


def _blur(here: Point) -> float:
    return 1e-12 * (1.0 + abs(here.value))


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
