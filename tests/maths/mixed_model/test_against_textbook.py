"""The engine against dense matrices over random problems."""

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from maths.mixed_model import exact, textbook
from maths.mixed_model.random_problems import problems

from drystone.maths.mixed_model import cluster_robust, fit, model_based, prepare, study_effects
from drystone.maths.mixed_model.criterion import evaluate
from drystone.maths.mixed_model.derivatives import expected_information, slope

LINEAR_SOLVE = 1e-9
#: Products of four inverses cost the dense formulas these digits.
DENSE_PRODUCTS = 1e-7
OPTIMUM = 1e-8

components = st.tuples(
    st.sampled_from([0.0, 1e-3, 0.3, 40.0]), st.sampled_from([0.0, 1e-3, 0.3, 40.0])
).map(np.array)
estimators = st.sampled_from(["REML", "ML"])


@settings(max_examples=150, deadline=None, derandomize=True)
@given(problems(), components, estimators)
def test_likelihood_and_derivatives(problem, theta, estimator):
    prepared = prepare(problem)
    at = evaluate(prepared, theta, estimator)
    here = slope(prepared, at, estimator)
    expected = expected_information(prepared, at, estimator)
    score, average, information = textbook.score_and_informations(problem, theta, estimator)
    np.testing.assert_allclose(
        at.log_likelihood,
        textbook.log_likelihood(problem, theta, estimator),
        rtol=LINEAR_SOLVE,
        atol=LINEAR_SOLVE,
    )
    scale = here.half_traces.max()
    np.testing.assert_allclose(here.score, score, rtol=LINEAR_SOLVE, atol=LINEAR_SOLVE * scale)
    np.testing.assert_allclose(
        here.average, average, rtol=DENSE_PRODUCTS, atol=1e-9 * np.abs(average).max()
    )
    np.testing.assert_allclose(
        expected, information, rtol=DENSE_PRODUCTS, atol=1e-9 * information.max()
    )


@settings(max_examples=100, deadline=None, derandomize=True)
@given(problems(), components)
def test_coefficients(problem, theta):
    fitted = fit(prepare(problem), held=dict(zip(problem.term_names, theta, strict=True)))
    coefficients, covariance = textbook.generalised_least_squares(problem, theta)
    np.testing.assert_allclose(fitted.coefficients, coefficients, rtol=LINEAR_SOLVE, atol=1e-10)
    np.testing.assert_allclose(fitted.covariance, covariance, rtol=LINEAR_SOLVE, atol=1e-12)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(problems(most_studies=6), components, st.sampled_from([1, 2, 3]))
def test_cluster_robust_inference(problem, theta, clusters):
    # double precision loses too many digits in the definition, so it is taken at 50
    prepared = prepare(problem)
    fitted = fit(prepared, held=dict(zip(problem.term_names, theta, strict=True)))
    codes = problem.study if clusters == 1 else problem.study % clusters
    robust = cluster_robust(prepared, fitted, codes)
    exactly, degrees = exact.cr2(problem, [exact.mpf(float(t)) for t in theta], codes)
    expected = np.array(exactly.tolist(), dtype=float)
    scale = np.abs(expected).max()
    np.testing.assert_allclose(robust.covariance, expected, rtol=1e-8, atol=1e-10 * scale)
    np.testing.assert_allclose(robust.degrees_of_freedom, np.array(degrees, float), rtol=1e-8)


@settings(max_examples=60, deadline=None, derandomize=True)
@given(problems(), estimators)
def test_no_point_of_a_grid_beats_the_fit(problem, estimator):
    fitted = fit(prepare(problem), estimator)
    grid = np.var(problem.y) * np.array([0.0, 1e-4, 1e-3, 1e-2, 0.1, 0.3, 1.0, 3.0])
    best = max(
        textbook.log_likelihood(problem, np.array([a, b]), estimator) for a in grid for b in grid
    )
    assert fitted.log_likelihood >= best - OPTIMUM


@settings(max_examples=60, deadline=None, derandomize=True)
@given(problems(), estimators)
def test_zeros_are_exact_and_certified(problem, estimator):
    fitted = fit(prepare(problem), estimator)
    score, _, _ = textbook.score_and_informations(problem, fitted.theta, estimator)
    for k, name in enumerate(problem.term_names):
        assert fitted.at_zero[name] == (fitted.components[name] == 0.0)
        if fitted.at_zero[name]:
            assert fitted.scores[name] <= 0.0
            np.testing.assert_allclose(fitted.scores[name], score[k], rtol=1e-6, atol=1e-6)
    assert fitted.certificate.gradient_norm <= 1e-9


@settings(max_examples=40, deadline=None, derandomize=True)
@given(problems(), st.randoms(use_true_random=False))
def test_row_order_and_study_codes_do_not_matter(problem, random):
    order = list(range(len(problem.y)))
    random.shuffle(order)
    place = np.argsort(order)
    known = problem.known
    moved = type(problem)(
        problem.y[order],
        problem.X[order],
        problem.coefficient_names,
        100 - 7 * problem.study[order],
        type(known)(
            known.variances[order], place[known.rows_i], place[known.rows_j], known.covariances
        ),
    )
    one, two = fit(prepare(problem)), fit(prepare(moved))
    np.testing.assert_allclose(one.log_likelihood, two.log_likelihood, rtol=1e-12, atol=1e-10)
    np.testing.assert_allclose(one.coefficients, two.coefficients, rtol=1e-9, atol=1e-10)
    np.testing.assert_allclose(one.theta, two.theta, rtol=1e-8, atol=1e-10)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(problems(), st.sampled_from([1e-6, 1e4]))
def test_units_scale_through(problem, unit):
    known = problem.known
    scaled = type(problem)(
        unit * problem.y,
        problem.X,
        problem.coefficient_names,
        problem.study,
        type(known)(
            unit**2 * known.variances, known.rows_i, known.rows_j, unit**2 * known.covariances
        ),
    )
    one, two = fit(prepare(problem)), fit(prepare(scaled))
    np.testing.assert_allclose(unit * one.coefficients, two.coefficients, rtol=1e-8, atol=1e-10)
    np.testing.assert_allclose(unit**2 * one.theta, two.theta, rtol=1e-8, atol=1e-9 * unit**2)


@settings(max_examples=40, deadline=None, derandomize=True)
@given(problems())
def test_predicted_study_deviations(problem):
    prepared = prepare(problem)
    theta = np.array([0.4, 0.1])
    found = study_effects(prepared, fit(prepared, held={"study": 0.4, "row": 0.1}))
    P = textbook.projection(problem, theta)
    Z = (problem.study[:, None] == found.study[None, :]).astype(float)
    np.testing.assert_allclose(
        found.deviations, 0.4 * Z.T @ P @ problem.y, rtol=LINEAR_SOLVE, atol=1e-10
    )
    expected = np.diag(0.4 * np.eye(len(found.study)) - 0.16 * Z.T @ P @ Z)
    np.testing.assert_allclose(found.prediction_variances, expected, rtol=1e-8, atol=1e-10)


@settings(max_examples=30, deadline=None, derandomize=True)
@given(problems())
def test_another_response_on_the_same_preparation(problem):
    y = problem.y[::-1] + 1.0
    fresh = prepare(
        type(problem)(y, problem.X, problem.coefficient_names, problem.study, problem.known)
    )
    reused = fit(prepare(problem).with_response(y))
    np.testing.assert_allclose(reused.log_likelihood, fit(fresh).log_likelihood, rtol=1e-12)
    assert model_based(reused).degrees_of_freedom[0] == fresh.studies - fresh.width


@settings(max_examples=30, deadline=None, derandomize=True)
@given(problems())
def test_taking_rows_takes_their_part_of_everything(problem):
    kept = problem.study != problem.study[0]
    left = problem.take(kept)
    np.testing.assert_array_equal(
        textbook.known_matrix(left), textbook.known_matrix(problem)[np.ix_(kept, kept)]
    )
    np.testing.assert_array_equal(left.X, problem.X[kept])
    np.testing.assert_array_equal(left.y, problem.y[kept])
    np.testing.assert_array_equal(problem.take(np.flatnonzero(kept)).study, problem.study[kept])
