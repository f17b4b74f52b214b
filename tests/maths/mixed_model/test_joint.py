"""Joint tests against their definition and against single tests."""

from functools import partial

import numpy as np
import pytest
from maths.mixed_model import textbook
from scipy.special import fdtrc

from drystone.maths.mixed_model import (
    KnownCovariance,
    Problem,
    cluster_robust,
    fit,
    joint_test,
    model_based,
    prepare,
)
from drystone.maths.mixed_model.identify import invert_information
from drystone.maths.mixed_model.refuse import (
    FlatLikelihoodError,
    InvalidProblemError,
    TooFewStudiesError,
)


@pytest.fixture(scope="module")
def fitted():
    random = np.random.default_rng(3)
    study = np.repeat(np.arange(14), 3)
    v = random.uniform(0.05, 0.2, 42)
    X = np.column_stack([np.ones(42), random.normal(size=(42, 2)), random.normal(size=14)[study]])
    y = 0.3 * random.normal(size=14)[study] + random.normal(size=42) * np.sqrt(v + 0.1)
    i = np.arange(0, 42, 3)
    known = KnownCovariance(v, i, i + 1, 0.5 * np.minimum(v[i], v[i + 1]))
    prepared = prepare(Problem(y, X, tuple("abcd"), study, known))
    return prepared, fit(prepared)


def test_approximate_hotelling_test_follows_its_definition(fitted):
    prepared, model = fitted
    rows = np.array([[0.0, 1, 0, 0], [0, 0, 1, 0], [0, 0.5, 0, 1]])
    robust = cluster_robust(prepared, model)
    eta, covariance = textbook.wishart_degrees(prepared.problem, model.theta, rows)
    assert robust.wishart_degrees(rows) == pytest.approx(eta, rel=1e-9)
    wald = (
        (rows @ model.coefficients)
        @ np.linalg.inv(rows @ covariance @ rows.T)
        @ (rows @ model.coefficients)
    )
    found = robust.joint_test(rows)
    assert found.f == pytest.approx((eta - 2) / (3 * eta) * wald, rel=1e-8)
    assert found.denominator_df == pytest.approx(eta - 2, rel=1e-9)
    assert found.p == pytest.approx(fdtrc(3, found.denominator_df, found.f), rel=1e-12)


def test_the_coordinates_of_a_hypothesis_do_not_matter(fitted):
    robust = cluster_robust(*fitted)
    rows = np.eye(4)[1:]
    other = np.array([[2.0, 1, 0], [0, 1, -1], [1, 0, 5]]) @ rows
    assert robust.joint_test(other).f == pytest.approx(robust.joint_test(rows).f, rel=1e-9)
    assert joint_test(fitted[1], other).f == pytest.approx(joint_test(fitted[1], rows).f, rel=1e-9)


def test_one_contrast_is_a_squared_t_test(fitted):
    robust, row = cluster_robust(*fitted), [[0.0, 0, 1, 0]]
    for joint, single in [
        (robust.joint_test(row), robust.infer(row)),
        (joint_test(fitted[1], row), model_based(fitted[1], row)),
    ]:
        assert joint.f == pytest.approx(single.t[0] ** 2, rel=1e-10)
        assert joint.denominator_df == pytest.approx(single.degrees_of_freedom[0], rel=1e-10)
        assert joint.p == pytest.approx(single.p[0], rel=1e-9)


def test_contrasts_that_repeat_each_other(fitted):
    rows = [[0.0, 1, 0, 0], [0, 2, 0, 0]]
    with pytest.raises(InvalidProblemError):
        joint_test(fitted[1], rows)
    with pytest.raises(InvalidProblemError):
        cluster_robust(*fitted).joint_test(rows)


@pytest.mark.parametrize("studies", [2, 3])
def test_too_few_studies_for_a_joint_test(studies):
    random = np.random.default_rng(5)
    study = np.repeat(np.arange(studies), 8)
    X = np.column_stack([np.ones(8 * studies), random.normal(size=(8 * studies, 2))])
    known = KnownCovariance(np.full(8 * studies, 0.1))
    y = random.normal(size=8 * studies)
    prepared = prepare(Problem(y, X, tuple("abc"), study, known, ("row",)))
    fitted = fit(prepared)
    for act in (cluster_robust(prepared, fitted).joint_test, partial(joint_test, fitted)):
        with pytest.raises(TooFewStudiesError):
            act(np.eye(3))


@pytest.mark.parametrize("information", [np.ones((2, 2)), np.diag([1.0, 0.0]), -np.eye(2)])
def test_a_likelihood_without_curvature_is_refused(information):
    with pytest.raises(FlatLikelihoodError) as caught:
        invert_information(information, ["study", "row"])
    assert caught.value.facts["levels"] == ["study", "row"]
