"""CR2, t, Knapp-Hartung, prediction, profiles against tests/reference/checks.json (34 digits)."""

import numpy as np
import pytest
from maths.mixed_model.reference_sheet import check, numbers, problem, table

from drystone.maths.mixed_model import (
    KnownCovariance,
    Problem,
    cluster_robust,
    fit,
    model_based,
    prediction_interval,
    prepare,
    profile_interval,
    residual_scale,
    scaled_by_residuals,
    zero_test,
)

REFERENCE_DIGITS = 1e-10  # rel_tol stated in checks.json


@pytest.fixture(scope="module")
def overall():
    prepared = prepare(problem("all_cases"))
    return prepared, fit(prepared)


@pytest.fixture(scope="module")
def time_lag():
    prepared = prepare(problem("all_cases", moderator=table()["year"], centre=2013.0))
    return prepared, fit(prepared)


def test_cr2_of_the_overall_mean(overall):
    expected = check("cr2.intercept")
    found = cluster_robust(*overall).infer()
    np.testing.assert_allclose(
        [found.standard_errors[0], found.degrees_of_freedom[0], found.t[0]],
        numbers([expected["se_cr2"], expected["df"], expected["t"]]),
        rtol=REFERENCE_DIGITS,
    )
    np.testing.assert_allclose(
        [found.low[0], found.high[0]], numbers(expected["ci"]), rtol=REFERENCE_DIGITS
    )


def test_cr2_with_a_moderator(time_lag):
    expected = check("timelag.sheet")
    prepared, fitted = time_lag
    found = cluster_robust(prepared, fitted)
    for value, name in [
        (fitted.coefficients, "b"),
        (fitted.standard_errors, "se"),
        (list(fitted.components.values()), "theta"),
        (found.standard_errors, "se_cr2"),
        (found.degrees_of_freedom, "df_cr2"),
    ]:
        np.testing.assert_allclose(value, numbers(expected[name]), rtol=REFERENCE_DIGITS)


def test_cr2_of_balanced_clusters_is_the_variance_of_cluster_means():
    # exact identity: sum (mean_j - mean)^2 / (J (J - 1)) on J - 1 degrees of freedom
    expected = check("cr2.identity")
    y = np.array([1.0, 1.4, 0.7, 0.9, 2.0, 1.8, 1.1, 1.5])
    known = KnownCovariance(np.ones(8))
    prepared = prepare(Problem(y, np.ones((8, 1)), ("overall",), np.arange(8) // 2, known, ()))
    found = cluster_robust(prepared, fit(prepared))
    means = y.reshape(4, 2).mean(axis=1)
    closed = ((means - means.mean()) ** 2).sum() / 12
    np.testing.assert_allclose(found.covariance[0, 0], closed, rtol=1e-12)
    np.testing.assert_allclose(closed, numbers(expected["var"]), rtol=1e-12)
    np.testing.assert_allclose(found.degrees_of_freedom[0], 3.0, rtol=1e-12)


def test_model_based_t_uses_studies_minus_coefficients(overall, time_lag):
    assert model_based(overall[1]).degrees_of_freedom[0] == 5.0
    assert model_based(time_lag[1]).degrees_of_freedom.tolist() == [4.0, 4.0]


def test_prediction_interval_on_study_degrees_of_freedom(overall):
    found = prediction_interval(overall[1])
    expected = numbers(check("prediction.sheet")["t_studies_minus_1"])
    np.testing.assert_allclose([found.low[0], found.high[0]], expected, rtol=REFERENCE_DIGITS)
    assert found.target == "a new effect in a new study"


def test_knapp_hartung(overall):
    expected = check("knapp_hartung.sheet")
    np.testing.assert_allclose(
        [
            residual_scale(*overall),
            scaled_by_residuals(*overall).standard_errors[0],
            scaled_by_residuals(*overall, at_least_one=True).standard_errors[0],
        ],
        numbers([expected["q"], expected["se"], expected["se_adhoc"]]),
        rtol=REFERENCE_DIGITS,
    )


@pytest.mark.parametrize(("level", "name"), [("study", "study"), ("row", "effect")])
def test_profile_intervals(overall, level, name):
    found = profile_interval(*overall, level)
    expected = numbers(check("profile.sheet")[name])
    np.testing.assert_allclose([found.low, found.high], expected, rtol=1e-9)


def test_zero_boundary_test(overall):
    expected = check("profile.sheet")
    found = zero_test(*overall, "study")
    np.testing.assert_allclose(
        [found.statistic, found.p],
        numbers([expected["lrt_study_zero"], expected["p_study_zero_mixture"]]),
        rtol=REFERENCE_DIGITS,
    )


@pytest.mark.parametrize(
    ("levels", "target"),
    [
        (["study", "row"], "a new effect in a new study"),
        (["study"], "the mean effect of a new study"),
        (["row"], "a new effect"),
    ],
)
def test_prediction_names_its_target_and_counts_its_levels(overall, levels, target):
    fitted = overall[1]
    found = prediction_interval(fitted, levels=levels)
    spread = sum(fitted.components[name] for name in levels) + fitted.covariance[0, 0]
    assert found.target == target
    assert found.standard_deviations[0] == pytest.approx(np.sqrt(spread), rel=1e-12)


def test_own_starts_end_where_a_close_start_ends(overall):
    prepared, fitted = overall
    near = {name: 1.1 * value for name, value in fitted.components.items()}
    again = fit(prepared, starts=[near])
    assert again.certificate.starts == 1
    np.testing.assert_allclose(again.theta, fitted.theta, rtol=1e-12)
