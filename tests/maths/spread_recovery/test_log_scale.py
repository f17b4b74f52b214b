"""Between raw and log scale."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from reference.formula_sheet import check

from drystone.maths import log_ratio
from drystone.maths import spread_recovery as recover

ALGEBRA = 1e-12
STATED = 1e-10  # rel_tol that checks.json states for computed values

positive = st.floats(1e-2, 1e3)
cvs = st.floats(1e-2, 3.0)


def test_raw_to_log_of_the_formula_sheet():
    entry = check("log.raw_to_log")
    found = recover.to_log(13.2, 3.1)
    wanted = [float(entry["expect"][name]) for name in ("mean_log", "sd_log")]
    np.testing.assert_allclose((found.mean, found.sd), wanted, rtol=STATED)


def test_log10_to_raw_of_the_formula_sheet():
    entry = check("log.log_to_raw")
    expected = {name: float(value) for name, value in entry["expect"].items()}
    found = recover.from_log10(1.08, 0.11)
    np.testing.assert_allclose(found.mean, expected["mean_raw"], rtol=STATED)
    np.testing.assert_allclose(found.sd, expected["sd_raw"], rtol=STATED)
    np.testing.assert_allclose(found.sd / found.mean, expected["cv_raw"], rtol=STATED)
    natural = recover.from_log(expected["mean_ln"], expected["sd_ln"])
    np.testing.assert_allclose(natural.mean, expected["mean_raw"], rtol=STATED)
    geometric = recover.from_log(expected["mean_ln"], 0.0).mean
    np.testing.assert_allclose(geometric, expected["geo_mean"], rtol=STATED)


def test_ratios_of_the_formula_sheet():
    entry = check("log.diff")
    expected = {name: float(value) for name, value in entry["expect"].items()}
    arms = (2.55, 0.30, 6, 2.31, 0.22, 6)
    geometric = recover.ratio_of_geometric_means(*arms)
    arithmetic = recover.ratio_of_arithmetic_means(*arms)
    found = (geometric.y, geometric.v, arithmetic.y, arithmetic.v)
    wanted = [
        expected[name]
        for name in ("ln_ratio_geometric", "v_geometric", "lnrr_arithmetic", "v_arithmetic")
    ]
    np.testing.assert_allclose(found, wanted, rtol=STATED)


@given(positive, cvs)
def test_there_and_back(mean, cv):
    logs = recover.to_log(mean, cv * mean)
    back = recover.from_log(logs.mean, logs.sd)
    np.testing.assert_allclose((back.mean, back.sd), (mean, cv * mean), rtol=ALGEBRA)


@given(positive, st.floats(0.01, 1.5), st.integers(2, 60), st.floats(60.0, 99.0))
def test_sd_of_logs_comes_back_from_limits_of_a_geometric_mean(centre, sd_log, n, percent):
    half = recover.t_quantile(n, percent) * sd_log / np.sqrt(n)
    if half > 300:  # beyond any number
        return
    lower, upper = centre * np.exp(-half), centre * np.exp(half)
    found = recover.log_sd_from_limits(lower, upper, n, percent)
    room = ALGEBRA + 1e-14 / half  # rounding of the limits
    np.testing.assert_allclose(found, sd_log, rtol=room)


@given(st.floats(-3.0, 5.0), st.floats(-3.0, 5.0), st.floats(0.01, 1.0), st.integers(3, 40))
def test_equal_log_sds_make_both_ratios_equal(mean1, mean2, sd, n):
    arms = (mean1, sd, n, mean2, sd, n)
    one, other = recover.ratio_of_geometric_means(*arms), recover.ratio_of_arithmetic_means(*arms)
    assert one.y == other.y
    assert one.v < other.v


def test_recovered_arms_give_the_ratio_of_arithmetic_means():
    # checks.json log.diff, arithmetic: 0.2608, here by way of recovered means and SDs. Their
    # delta-method variance, (exp(u^2) - 1) / n, is u^2 / n + u^4 / (2 n) and more: below the stated
    # variance by less than u^4 / n, here 0.002
    entry = check("log.diff")["expect"]
    one, other = recover.from_log(2.55, 0.30), recover.from_log(2.31, 0.22)
    theta = [log_ratio.theta((arm.sd / arm.mean) ** 2, 6) for arm in (one, other)]
    found = log_ratio.first_order(one.mean, other.mean, *theta)
    np.testing.assert_allclose(found.y, float(entry["lnrr_arithmetic"]), rtol=STATED)
    assert abs(found.v - float(entry["v_arithmetic"])) < 0.3**4 / 6 + 0.22**4 / 6


@pytest.mark.parametrize("mean", [0.0, -2.0, np.nan])
def test_no_logarithm_without_a_positive_mean(mean):
    assert np.isnan(recover.to_log(mean, 1.0).mean)
    assert np.isnan(recover.log_sd_from_limits(mean, 2.0, 5, 95.0))


def test_numbers_beyond_any_are_infinite_not_an_error():
    assert np.isinf(recover.from_log(800.0, 0.1).mean)
    assert np.isinf(recover.from_log(1.0, 60.0).sd)
