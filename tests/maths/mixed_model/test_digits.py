"""How many digits are right, against the same likelihood maximised at 50 digits."""

from collections.abc import Callable

import numpy as np
import pytest
from maths.mixed_model import exact, reference_sheet

from drystone.maths.mixed_model import KnownCovariance, Problem, cluster_robust, fit, prepare

ORDINARY_DIGITS = 12
COLLINEAR_DIGITS = 7

Column = Callable[[np.random.Generator, int], np.ndarray]


def _ordinary(random: np.random.Generator, rows: int) -> np.ndarray:
    return random.uniform(0.05, 0.2, rows)


def _wide(random: np.random.Generator, rows: int) -> np.ndarray:
    return 10.0 ** random.permutation(np.linspace(-6, 3, rows))


def _tiny(random: np.random.Generator, rows: int) -> np.ndarray:
    return random.uniform(0.5e-12, 2e-12, rows)


def _mean(random: np.random.Generator, rows: int) -> np.ndarray:
    return np.ones((rows, 1))


def _years(random: np.random.Generator, rows: int) -> np.ndarray:
    return np.column_stack([np.ones(rows), 2000.0 + random.integers(0, 20, rows)])


def _collinear(random: np.random.Generator, rows: int) -> np.ndarray:
    column = random.normal(size=rows)
    return np.column_stack([np.ones(rows), column, column + 1e-7 * random.normal(size=rows)])


def _make(
    seed: int,
    variances: Column,
    between: float,
    within: float,
    *,
    sizes: tuple[int, ...] = (3, 3, 3, 3, 3),
    correlation: float = 0.0,
    design: Column = _mean,
) -> Problem:
    """Invented rows; the first two of every study share a control when `correlation` is given."""
    random = np.random.default_rng(seed)
    study = np.repeat(np.arange(len(sizes)), sizes)
    v = variances(random, len(study))
    y = 0.3 + np.sqrt(between) * random.normal(size=len(sizes))[study]
    y += random.normal(size=len(study)) * np.sqrt(v + within)
    X = design(random, len(study))
    i = np.flatnonzero(np.r_[True, study[1:] != study[:-1]]) if correlation else np.empty(0, int)
    known = KnownCovariance(v, i, i + 1, correlation * np.sqrt(v[i] * v[i + 1]))
    return Problem(y, X, tuple("abc"[: X.shape[1]]), study, known)


PROBLEMS = {
    "the 12-row sheet": reference_sheet.problem("all_cases"),
    "variances from 1e-6 to 1e3": _make(1, _wide, 0.5, 0.1),
    "the same with studies far apart": _make(3, _wide, 1e4, 0.1),
    "the same with correlation .999": _make(7, _wide, 0.5, 0.1, correlation=0.999),
    "study component at zero": _make(2, _ordinary, 0.0, 0.5),
    "shared-control correlation .999": _make(5, _ordinary, 0.3, 0.1, correlation=0.999),
    "two studies": _make(6, _ordinary, 0.6, 0.2, sizes=(6, 6)),
    "variances of 1e-12": _make(9, _tiny, 0.3, 0.1),
    "years as they are": _make(10, _ordinary, 0.3, 0.1, design=_years),
}


def _least_digits(problem: Problem) -> dict[str, float]:
    """Fewest correct digits of each kind of result."""
    prepared = prepare(problem)
    fitted = fit(prepared)
    robust = cluster_robust(prepared, fitted)
    true = exact.maximum(problem, fitted.theta)
    robust_true, degrees_true = exact.cr2(problem, true.theta)
    places = range(len(fitted.coefficients))
    free = [k for k, value in enumerate(fitted.theta) if value > 0]
    pairs = {
        "components": [(fitted.theta[k], true.theta[k]) for k in free],
        "coefficients": [(fitted.coefficients[k], true.coefficients[k]) for k in places],
        "variances": [(fitted.covariance[k, k], true.covariance[k, k]) for k in places],
        "robust variances": [(robust.covariance[k, k], robust_true[k, k]) for k in places],
        "robust df": [(robust.degrees_of_freedom[k], degrees_true[k]) for k in places],
        "log-likelihood": [(fitted.log_likelihood, true.log_likelihood)],
    }
    return {name: min(exact.digits(a, b) for a, b in both) for name, both in pairs.items()}


@pytest.mark.parametrize("name", PROBLEMS)
def test_ordinary_and_hard_cases(name):
    digits = _least_digits(PROBLEMS[name])
    assert min(digits.values()) >= ORDINARY_DIGITS, digits


def test_collinear_columns():
    # two columns that differ by 1e-7: the condition number takes seven of sixteen digits
    digits = _least_digits(_make(8, _ordinary, 0.3, 0.1, design=_collinear))
    assert min(digits.values()) >= COLLINEAR_DIGITS, digits


@pytest.mark.parametrize("name", ["study component at zero", "the same with correlation .999"])
def test_a_zero_is_exact_and_its_score_is_right(name):
    problem = PROBLEMS[name]
    fitted = fit(prepare(problem))
    true = exact.maximum(problem, fitted.theta)
    assert fitted.components["study"] == 0.0
    assert fitted.at_zero["study"]
    assert true.score[0] < 0
    assert exact.digits(fitted.scores["study"], true.score[0]) >= ORDINARY_DIGITS
