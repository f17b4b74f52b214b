"""Whether an SD looks like a standard error: laws against simulation and quadrature."""

import math

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from drystone.maths import spread_screen as screen

LINEAR = 1e-9


@pytest.mark.parametrize("n", [2, 3, 7, 40])
def test_moments_of_the_log_sd(n):
    # by integration of the density of ln s at 30 digits, with mpmath
    half = mpmath.mpf(n - 1) / 2

    def density(x):
        return (
            2
            * half**half
            / mpmath.gamma(half)
            * mpmath.exp(2 * half * x - half * mpmath.e ** (2 * x))
        )

    ends = [-60, -20, -5, -1, 0, 1, 3]
    mean = mpmath.quad(lambda x: x * density(x), ends)
    variance = mpmath.quad(lambda x: (x - mean) ** 2 * density(x), ends)
    assert screen.log_sd_bias(n) == pytest.approx(float(mean), rel=LINEAR)
    assert screen.log_sd_variance(n) == pytest.approx(float(variance), rel=LINEAR)


def test_reference_leaves_out_the_own_study_and_the_sampling_error():
    draws = np.random.default_rng(7)
    studies = np.repeat(np.arange(50), 4)
    values = draws.normal(1.0, 0.5, 200) + draws.normal(0.0, 0.4, 200)
    values[studies == 3] += 50.0
    found = screen.reference(values, np.full(200, 0.16), studies)
    # 200 draws: the median's SE is about 1.25 x 0.64 / sqrt(196) = 0.06, four of them
    assert found.location == pytest.approx(np.full(200, 1.0), abs=0.24)
    # the MAD of 196 values has a relative SE of about 1.17 / sqrt(196); scale^2 is a difference
    assert found.scale == pytest.approx(np.full(200, 0.5), abs=0.25)
    assert np.unique(found.location[studies == 3]).size == 1


def test_too_few_others_give_no_reference():
    found = screen.reference(np.zeros(6), np.zeros(6), np.arange(6))
    assert np.isnan(found.scale).all()


def test_density_of_one_arm_is_a_density():
    x = np.linspace(-40.0, 20.0, 60_001)
    one = np.ones_like(x)
    logs = screen.log_density(x, 5 * one, -1.5 * one, 0.4 * one, np.arange(x.size))
    total = np.trapezoid(np.exp(logs), x)
    assert total == pytest.approx(1.0, abs=1e-6)  # trapezes and the ends


def test_standard_errors_of_a_study_are_found_and_sds_are_not():
    n, scale, location = np.full(6, 10.0), np.full(6, 0.3), np.full(6, math.log(0.25))
    block = np.zeros(6, dtype=np.intp)
    sds = location + np.array([0.1, -0.2, 0.3, 0.0, -0.1, 0.2])
    ses = sds - 0.5 * np.log(n)
    assert screen.log_ratio_se(ses, n, location, scale, block)[0] > math.log(100)
    assert screen.log_ratio_se(sds, n, location, scale, block)[0] < -math.log(100)
    too_wide = sds + 0.5 * np.log(n)
    assert screen.log_ratio_sd(too_wide, n, location, scale, block)[0] > math.log(20)


def test_the_two_questions_mirror_each_other():
    n, scale, location = np.array([4.0, 9.0]), np.full(2, 0.4), np.full(2, -1.0)
    block = np.array([0, 1])
    log_cv = np.array([-2.0, -1.5])
    forth = screen.log_ratio_se(log_cv, n, location, scale, block)
    back = screen.log_ratio_sd(log_cv + 0.5 * np.log(n), n, location, scale, block)
    assert forth == pytest.approx(-back, rel=LINEAR)


def test_chance_of_small_and_large_sds_is_that_of_chi_squared():
    # chi-squared with 2 degrees of freedom: P(X < x) = 1 - exp(-x / 2), by hand
    n, log_cv = np.array([3.0]), np.array([math.log(0.1)])
    zero, one = np.zeros(1), np.ones(1)
    ratio = (0.1 / math.exp(-2.0)) ** 2
    low = screen.too_small(log_cv, n, zero, one, 2.0)
    assert low == pytest.approx(1 - math.exp(-ratio), rel=LINEAR)
    ratio = (0.1 / math.exp(2.0)) ** 2
    assert screen.too_large(log_cv, n, zero, one, 2.0) == pytest.approx(
        math.exp(-ratio), rel=LINEAR
    )


@given(
    st.lists(
        st.tuples(st.floats(-700, 700), st.floats(2, 1e6), st.floats(-5, 5), st.floats(0.2, 5)),
        min_size=1,
        max_size=5,
    )
)
def test_any_finite_arm_gives_a_number(arms):
    log_cv, n, location, scale = (np.array(part) for part in zip(*arms, strict=True))
    found = screen.log_ratio_se(log_cv, n, location, scale, np.arange(len(arms)))
    assert not np.isnan(found).any()
