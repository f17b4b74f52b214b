"""Heterogeneity measures against tests/reference/checks.json and identities."""

import numpy as np
import pytest
from maths.mixed_model.reference_sheet import check, numbers, problem, table

from drystone.maths import heterogeneity
from drystone.maths.mixed_model import KnownCovariance, Problem, fit, prepare
from drystone.maths.mixed_model.refuse import NoInterceptError

REFERENCE_DIGITS = 1e-10  # rel_tol stated in checks.json


@pytest.fixture(scope="module")
def overall():
    prepared = prepare(problem("all_cases"))
    return prepared, fit(prepared)


@pytest.fixture(scope="module")
def time_lag():
    prepared = prepare(problem("all_cases", moderator=table()["year"], centre=2013.0))
    return prepared, fit(prepared)


def test_homogeneity(overall):
    expected = check("heterogeneity.sheet")
    found = heterogeneity.homogeneity_test(overall[0])
    np.testing.assert_allclose(
        [found.q, found.degrees_of_freedom, found.p, found.h2],
        numbers([expected[name] for name in ("Q_fullV", "df", "p_Q_fullV", "H2")]),
        rtol=REFERENCE_DIGITS,
    )


def test_shares(overall):
    expected = check("heterogeneity.sheet")
    found = heterogeneity.shares(*overall)
    np.testing.assert_allclose(
        [found.typical_variance, found.total, found.by_level["study"], found.by_level["row"]],
        numbers([expected[k] for k in ("s2_typical_traceP", "I2_total", "I2_study", "I2_effect")]),
        rtol=REFERENCE_DIGITS,
    )
    np.testing.assert_allclose(sum(found.by_level.values()), found.total, rtol=1e-12)


def test_relative_spread(overall):
    expected = check("heterogeneity.sheet")
    found = heterogeneity.relative_spread(*overall)
    np.testing.assert_allclose(
        [found.cvh1, found.cvh2, found.m1, found.m2],
        numbers([expected[k] for k in ("CVH1", "CVH2", "M1", "M2")]),
        rtol=REFERENCE_DIGITS,
    )
    study = heterogeneity.relative_spread(*overall, level="study")
    fitted = overall[1]
    assert study.cvh2 == pytest.approx(
        fitted.components["study"] / fitted.coefficients[0] ** 2, rel=1e-12
    )


def test_relative_spread_needs_one_overall_mean(time_lag):
    with pytest.raises(NoInterceptError):
        heterogeneity.relative_spread(*time_lag)


def test_explained_shares(time_lag):
    expected = check("timelag.sheet")
    found = heterogeneity.explained(*time_lag)
    np.testing.assert_allclose(
        [found.marginal, found.conditional],
        numbers([expected["R2_marginal"], expected["R2_conditional"]]),
        rtol=REFERENCE_DIGITS,
    )


def test_typical_variance_of_a_diagonal_equals_the_closed_form():
    # Higgins & Thompson 2002: (K - 1) sum w / ((sum w)^2 - sum w^2)
    v = np.random.default_rng(4).uniform(0.01, 2.0, 30)
    y = np.random.default_rng(5).normal(size=30)
    prepared = prepare(
        Problem(y, np.ones((30, 1)), ("overall",), np.arange(30), KnownCovariance(v), ("row",))
    )
    w = 1 / v
    closed = 29 * w.sum() / (w.sum() ** 2 - (w**2).sum())
    assert heterogeneity.typical_variance(prepared) == pytest.approx(closed, rel=1e-12)


def test_typical_variance_follows_an_estimated_scale():
    prepared = prepare(problem("all_cases", terms=("study", "scale")))
    fitted = fit(prepared)
    found = heterogeneity.shares(prepared, fitted)
    expected = heterogeneity.typical_variance(prepared) * fitted.components["scale"]
    assert found.typical_variance == pytest.approx(expected, rel=1e-12)
    assert set(found.by_level) == {"study"}
