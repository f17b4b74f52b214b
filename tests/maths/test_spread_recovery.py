"""SDs from other spreads: reference values, a published value, and laws that must hold."""

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from reference.formula_sheet import check

from drystone.maths import spread_recovery as recover

ALGEBRA = 1e-12
STATED = 1e-10  # rel_tol that checks.json states for computed values

positive = st.floats(1e-3, 1e3)
counts = st.integers(2, 200)


def test_sd_from_se_of_the_formula_sheet():
    entry = check("sd.from_se")
    found = recover.sd_from_se(float(entry["inputs"]["se"]), entry["inputs"]["n"])
    np.testing.assert_allclose(found, float(entry["expect"]["sd"]), rtol=STATED)


def test_sd_from_limits_of_the_formula_sheet():
    entry = check("sd.from_ci_one_mean")
    lower, upper, n = float(entry["inputs"]["lo"]), float(entry["inputs"]["hi"]), 6
    expected = {name: float(value) for name, value in entry["expect"].items()}
    np.testing.assert_allclose(recover.t_quantile(n, 95.0), expected["t_crit"], rtol=STATED)
    found = recover.sd_from_limits(lower, upper, n, 95.0)
    np.testing.assert_allclose(found, expected["sd_t"], rtol=STATED)


def test_sd_from_limits_printed_in_the_cochrane_handbook():
    # Cochrane Handbook 6.5.2.2: n 25, limits 30.0 and 34.2, divisor 4.128, SD 5.09; known from
    # memory, not read again (tests/reference/checks.json, sd.from_ci.published).
    assert abs(2 * recover.t_quantile(25, 95.0) - 4.128) <= 0.5e-3
    assert abs(recover.sd_from_limits(30.0, 34.2, 25, 95.0) - 5.09) <= 0.5e-2


def test_sd_from_cv_percent_of_the_formula_sheet():
    entry = check("sd.from_cv")
    cv, own, grand = (float(entry["inputs"][k]) for k in ("cv_percent", "group_mean", "grand_mean"))
    found = [recover.sd_from_cv_percent(cv, mean) for mean in (own, grand)]
    expected = [float(entry["expect"][k]) for k in ("sd_group_cv", "sd_anova_cv")]
    np.testing.assert_allclose(found, expected, rtol=STATED)


@pytest.mark.parametrize("n", [2, 3, 7, 60, 441])
@pytest.mark.parametrize("percent", [80.0, 95.0, 99.0])
def test_t_quantile_against_50_digits(n, percent):
    # The quantile is right when the distribution function, here by mpmath's incomplete beta
    # function with 50 digits, gives the level back.
    with mpmath.workdps(50):
        t, df = mpmath.mpf(float(recover.t_quantile(n, percent))), mpmath.mpf(n - 1)
        tail = mpmath.betainc(df / 2, 0.5, 0, df / (df + t * t), regularized=True)
        # ALGEBRA times 10: with n 441 a relative error of t is about 10 times larger in the tail
        assert abs(tail / (1 - mpmath.mpf(percent) / 100) - 1) < 10 * ALGEBRA


@given(positive, counts)
def test_variance_and_se_give_the_sd_back(sd, n):
    np.testing.assert_allclose(recover.sd_from_variance(sd * sd), sd, rtol=ALGEBRA)
    np.testing.assert_allclose(recover.sd_from_se(sd / np.sqrt(n), n), sd, rtol=ALGEBRA)


@given(positive, positive, counts, st.floats(60.0, 99.0))
def test_limits_and_half_width_agree(mean, half, n, percent):
    by_limits = recover.sd_from_limits(mean - half, mean + half, n, percent)
    by_half = recover.sd_from_half_width(half, n, percent)
    # the limits themselves carry a rounding error of the size of the mean
    room = 4 * np.finfo(float).eps * (mean + half) / half
    np.testing.assert_allclose(by_limits, by_half, rtol=ALGEBRA + room)


@given(positive, positive, positive, counts)
def test_unit_of_measurement_scales_the_sd(half, mean, factor, n):
    scaled = recover.sd_from_half_width(factor * half, n, 95.0)
    np.testing.assert_allclose(
        scaled, factor * recover.sd_from_half_width(half, n, 95.0), rtol=ALGEBRA
    )
    scaled = recover.sd_from_cv_percent(20.0, factor * mean)
    np.testing.assert_allclose(
        scaled, factor * recover.sd_from_cv_percent(20.0, mean), rtol=ALGEBRA
    )


def test_many_replicates_turn_t_into_the_normal_quantile():
    # 1.95996398454005: z_crit of checks.json, sd.from_ci_one_mean; t exceeds it by the share
    # (z^2 + 1) / (4 n) = 1.2e-9
    np.testing.assert_allclose(recover.t_quantile(1e9, 95.0), 1.95996398454005, rtol=1e-8)


@pytest.mark.parametrize("n", [1.0, 0.0, -3.0, np.nan])
def test_one_replicate_has_no_interval(n):
    assert np.isnan(recover.sd_from_limits(1.0, 2.0, n, 95.0))


def test_missing_numbers_stay_missing():
    missing = np.array([np.nan, 1.0])
    assert np.isnan(recover.sd_from_se(missing, missing[::-1])).all()
    assert np.isnan(recover.sd_from_cv_percent(missing, missing[::-1])).all()
    assert np.isnan(recover.sd_from_limits(missing, 2.0, 5.0, 95.0))[0]


def test_asymmetry_is_zero_for_a_centred_mean_and_one_at_a_limit():
    # by hand: |(3 - 2) - (2 - 1)| / 2 = 0; |(3 - 1) - (1 - 1)| / 2 = 1; |1.5 - .5| / 2 = .5
    found = recover.limit_asymmetry([2.0, 1.0, 1.5], 1.0, 3.0)
    np.testing.assert_allclose(found, [0.0, 1.0, 0.5], rtol=ALGEBRA)
