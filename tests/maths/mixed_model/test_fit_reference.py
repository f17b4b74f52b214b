"""Fits of the 12-row sheet against values computed with 34 digits (tests/reference/checks.json)."""

import numpy as np
import pytest
from maths.mixed_model.reference_sheet import check, numbers, problem

from drystone.maths.mixed_model import fit, prepare

REFERENCE_DIGITS = 1e-10  # rel_tol stated in checks.json

CASES = [
    ("fit.complete_case", "complete_case", "first", "REML"),
    ("fit.missing_cases.first", "missing_cases", "first", "REML"),
    ("fit.missing_cases.second", "missing_cases", "second", "REML"),
    ("fit.all_cases.first", "all_cases", "first", "REML"),
    ("fit.all_cases.second", "all_cases", "second", "REML"),
    ("fit.all_cases.first.ML", "all_cases", "first", "ML"),
]


@pytest.mark.parametrize(("name", "strategy", "order", "estimator"), CASES)
def test_nested_fit_agrees_with_the_reference(name, strategy, order, estimator):
    expected = check(name)
    fitted = fit(prepare(problem(strategy, order)), estimator)
    np.testing.assert_allclose(
        [fitted.coefficients[0], fitted.standard_errors[0], fitted.log_likelihood],
        numbers([expected["mu"], expected["se"], expected["loglik"]]),
        rtol=REFERENCE_DIGITS,
    )
    np.testing.assert_allclose(
        list(fitted.components.values()), numbers(expected["theta"]), rtol=REFERENCE_DIGITS
    )
    assert fitted.certificate.converged
    assert fitted.certificate.starts_agree


@pytest.mark.parametrize(
    ("name", "terms"),
    [
        ("fit.multiplicative.study_only", ("study", "scale")),
        ("fit.multiplicative.with_effect_level", ("study", "row", "scale")),
    ],
)
def test_estimated_scale_of_the_known_covariance(name, terms):
    expected = check(name)
    fitted = fit(prepare(problem("all_cases", terms=terms)))
    np.testing.assert_allclose(
        [fitted.coefficients[0], fitted.standard_errors[0], fitted.log_likelihood],
        numbers([expected["mu"], expected["se"], expected["loglik"]]),
        rtol=REFERENCE_DIGITS,
    )
    np.testing.assert_allclose(
        list(fitted.components.values()), numbers(expected["theta"]), rtol=REFERENCE_DIGITS
    )


def test_likelihood_at_fixed_components_needs_no_search():
    expected = check("fit.fixed_theta")["multiplicative"]
    held = {"study": 0.03, "row": 0.005, "scale": 0.8}
    fitted = fit(prepare(problem("all_cases", terms=("study", "row", "scale"))), held=held)
    np.testing.assert_allclose(
        [fitted.coefficients[0], fitted.standard_errors[0], fitted.log_likelihood],
        numbers([expected["mu"], expected["se"], expected["reml_loglik"]]),
        rtol=REFERENCE_DIGITS,
    )
