"""Published results and closed forms."""

import numpy as np
import pytest
from maths.mixed_model.reference_sheet import TIMES

from drystone.maths import heterogeneity
from drystone.maths.mixed_model import KnownCovariance, Problem, fit, prepare, scaled_by_residuals

#: Colditz et al. 1994, JAMA 271:698-702 (13 BCG trials), as in tests/reference/checks.json,
#: bcg.logOR.ML: diseased and not diseased, vaccinated then control.
BCG = np.array(
    [
        [4, 119, 11, 128],
        [6, 300, 29, 274],
        [3, 228, 11, 209],
        [62, 13536, 248, 12619],
        [33, 5036, 47, 5761],
        [180, 1361, 372, 1079],
        [8, 2537, 10, 619],
        [505, 87886, 499, 87892],
        [29, 7470, 45, 7232],
        [17, 1699, 65, 1600],
        [186, 50448, 141, 27197],
        [5, 2493, 3, 2338],
        [27, 16886, 29, 17825],
    ],
    dtype=float,
)


def _published(name: str) -> dict:
    return next(c for c in TIMES["checks"] if c["id"] == name)


def _one_row_per_study(y: np.ndarray, v: np.ndarray):
    return prepare(
        Problem(
            y, np.ones((len(y), 1)), ("overall",), np.arange(len(y)), KnownCovariance(v), ("row",)
        )
    )


def test_bcg_risk_ratios():
    # values widely reprinted for these trials; from memory, no single page re-read (checks.json)
    expected = _published("bcg.logRR")
    a, b, c, d = BCG.T
    y, v = np.log(a / (a + b)) - np.log(c / (c + d)), 1 / a - 1 / (a + b) + 1 / c - 1 / (c + d)
    prepared = _one_row_per_study(y, v)
    fitted = fit(prepared)
    found = {
        "Q": heterogeneity.homogeneity_test(prepared).q,
        "tau2_REML": fitted.components["row"],
        "mean_REML": fitted.coefficients[0],
        "se_REML": fitted.standard_errors[0],
        "I2_REML_pct": 100 * heterogeneity.shares(prepared, fitted).total,
    }
    for name, value in found.items():
        half = 0.5 * 10.0 ** -expected["decimals"][name]
        assert abs(value - float(expected["published"][name])) <= half, name
        assert value == pytest.approx(float(expected["ours"][name]), rel=1e-10), name
    robust = scaled_by_residuals(prepared, fitted).standard_errors[0]
    assert robust == pytest.approx(float(expected["ours"]["se_KH"]), rel=1e-10)


def test_bcg_odds_ratios_by_maximum_likelihood():
    # van Houwelingen, Arends & Stijnen 2002, Stat Med 21:589, section 3; values from memory
    expected = _published("bcg.logOR.ML")
    a, b, c, d = BCG.T
    prepared = _one_row_per_study(np.log(a * d / (b * c)), (1 / BCG).sum(axis=1))
    random, common = fit(prepared, "ML"), fit(prepared, "ML", held={"row": 0.0})
    found = {
        "common_mean": common.coefficients[0],
        "common_se": common.standard_errors[0],
        "mean": random.coefficients[0],
        "se": random.standard_errors[0],
        "tau2": random.components["row"],
    }
    for name, value in found.items():
        assert abs(value - float(expected["published"][name])) <= 0.5e-3, name
        assert value == pytest.approx(float(expected["ours"][name]), rel=1e-10), name


@pytest.mark.parametrize("seed", range(5))
def test_balanced_one_way_layout_has_closed_forms(seed):
    """REML equals the analysis of variance when the design is balanced and no variance is negative.

    Searle, Casella & McCulloch 1992, Variance Components, section 3.8 (from memory): the within
    variance is MSW, the between variance (MSB - MSW) / n; zero if that is negative, with the pooled
    variance in its place.
    """
    studies, size, noise = 8, 4, 0.03
    random = np.random.default_rng(seed)
    y = random.normal(size=(studies, size)) * 0.5 + 0.4 * random.normal(size=(studies, 1))
    known = KnownCovariance(np.full(studies * size, noise))
    study = np.repeat(np.arange(studies), size)
    X = np.ones((studies * size, 1))
    fitted = fit(prepare(Problem(y.ravel(), X, ("overall",), study, known)))
    within = ((y - y.mean(axis=1, keepdims=True)) ** 2).sum() / (studies * (size - 1))
    between = size * ((y.mean(axis=1) - y.mean()) ** 2).sum() / (studies - 1)
    if between < within:
        within = between = ((y - y.mean()) ** 2).sum() / (studies * size - 1)
    expected = [(between - within) / size, within - noise]
    np.testing.assert_allclose(fitted.theta, expected, rtol=1e-11, atol=1e-16)
    np.testing.assert_allclose(fitted.coefficients[0], y.mean(), rtol=1e-12)
    np.testing.assert_allclose(fitted.covariance[0, 0], between / (studies * size), rtol=1e-12)
