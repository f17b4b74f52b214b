"""An estimated factor for the variances of some rows, against tests/reference/checks.json."""

import numpy as np
import pytest
from maths.mixed_model import textbook
from maths.mixed_model.reference_sheet import check, numbers, problem, table

from drystone.maths.mixed_model import fit, fit_partly_scaled, prepare, scale_rows
from drystone.maths.mixed_model.partly_scaled import _at, _score
from drystone.maths.mixed_model.refuse import FlatLikelihoodError, InvalidProblemError

REFERENCE_DIGITS = 1e-10  # rel_tol stated in checks.json
MISSING = np.isnan(table()["sd_t"])


def test_reference_fit():
    expected = check("fit.hybrid")
    found = fit_partly_scaled(problem("missing_cases"), MISSING)
    np.testing.assert_allclose(
        [*found.fit.coefficients, *found.fit.standard_errors, found.fit.log_likelihood],
        numbers([expected["mu"], expected["se"], expected["loglik"]]),
        rtol=REFERENCE_DIGITS,
    )
    np.testing.assert_allclose(
        [*found.fit.theta, found.factor], numbers(expected["theta"]), rtol=REFERENCE_DIGITS
    )
    assert found.scaled_rows == 3


def test_reference_likelihood_at_fixed_components():
    expected = check("fit.fixed_theta")["hybrid"]
    scaled = scale_rows(problem("missing_cases"), MISSING, 0.8)
    found = fit(prepare(scaled), held={"study": 0.03, "row": 0.005})
    np.testing.assert_allclose(
        [*found.coefficients, *found.standard_errors, found.log_likelihood],
        numbers([expected["mu"], expected["se"], expected["reml_loglik"]]),
        rtol=REFERENCE_DIGITS,
    )


@pytest.mark.parametrize("estimator", ["REML", "ML"])
@pytest.mark.parametrize("x", [-1.0, 0.0, 1.3])
def test_slope_of_the_profile_is_a_difference_quotient(estimator, x):
    # rows 7, 8 share a control and are marked; row 2 shares one with the unmarked row 1
    marked = MISSING.copy()
    marked[1] = True
    stated = problem("missing_cases")
    found = _score(*_at(stated, marked, estimator, x), marked)
    step = 1e-4

    def value(at: float) -> float:
        scaled = scale_rows(stated, marked, np.exp(at))
        return textbook.log_likelihood(scaled, fit(prepare(scaled), estimator).theta, estimator)

    # fourth-order central difference: truncation ~ step^4, rounding ~ 1e-15 / step
    quotient = (8 * (value(x + step) - value(x - step)) - value(x + 2 * step)) / (12 * step)
    quotient += value(x - 2 * step) / (12 * step)
    assert found == pytest.approx(quotient, abs=1e-8)


@pytest.mark.parametrize("marked", [np.zeros(12, bool), np.ones(12, bool), np.arange(12) > 20.5])
def test_both_kinds_of_rows_are_needed(marked):
    with pytest.raises(InvalidProblemError):
        fit_partly_scaled(problem("missing_cases"), marked)


def test_a_factor_without_bound_is_refused():
    # one marked row with an effect far from the others: its own factor has no upper bound
    stated = problem("missing_cases")
    y = stated.y.copy()
    y[8] = 1e3
    far = type(stated)(
        y, stated.X, stated.coefficient_names, stated.study, stated.known, ("study",)
    )
    with pytest.raises(FlatLikelihoodError):
        fit_partly_scaled(far, np.arange(12) == 8)
