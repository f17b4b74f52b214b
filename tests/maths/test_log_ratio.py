"""Log response ratio: formula sheet, high precision, properties, limits.

Expected numbers: tests/reference/checks.json (invented inputs, mpmath at 34 digits). Published:
Borenstein, Hedges, Higgins & Rothstein 2009, ch. 4 (from memory).
"""

from __future__ import annotations

import mpmath
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from reference.formula_sheet import check

from drystone.maths import log_ratio

ALGEBRA = 1e-12
MEAN = st.floats(1e-3, 1e6)
CV = st.floats(1e-3, 1.5)
N = st.integers(2, 500)


def _one(value: float) -> np.ndarray:
    return np.array([float(value)])


def _inputs(name: str) -> dict[str, np.ndarray]:
    return {key: _one(value) for key, value in check(name)["inputs"].items()}


def _thetas(given: dict[str, np.ndarray]) -> tuple[np.ndarray, np.ndarray]:
    t = log_ratio.theta((given["sd_t"] / given["mean_t"]) ** 2, given["n_t"])
    c = log_ratio.theta((given["sd_c"] / given["mean_c"]) ** 2, given["n_c"])
    return t, c


def test_first_order_matches_formula_sheet():
    given, wanted = _inputs("lnrr.first_order"), check("lnrr.first_order")["expect"]
    found = log_ratio.first_order(given["mean_t"], given["mean_c"], *_thetas(given))
    np.testing.assert_allclose(found.y, float(wanted["y"]), rtol=ALGEBRA)
    np.testing.assert_allclose(found.v, float(wanted["v"]), rtol=ALGEBRA)
    percent = log_ratio.percent_change(found.y)
    np.testing.assert_allclose(percent, float(wanted["percent_change"]), rtol=ALGEBRA)


def test_second_order_matches_formula_sheet():
    given, wanted = _inputs("lnrr.second_order"), check("lnrr.second_order")["expect"]
    found = log_ratio.second_order(given["mean_t"], given["mean_c"], *_thetas(given))
    np.testing.assert_allclose(found.y, float(wanted["y"]), rtol=ALGEBRA)
    np.testing.assert_allclose(found.v, float(wanted["v"]), rtol=ALGEBRA)


def test_pooled_sd_example_matches_the_handbook():
    """Means 61.515 and 51.015 with SDs 19.475, n 10 each: printed ln RR .1871, v .0246.

    Borenstein et al. 2009 (from memory, as is the pooled SD); the book takes the logarithm of the
    rounded ratio 1.2058.
    """
    entry = check("lnrr.pooledsd.published")
    given = {key: _one(value) for key, value in entry["inputs"].items()}
    sd = given.get("s_pooled", given.get("sd_pooled", given.get("sp")))
    mean_t, mean_c = given["mean_t"], given["mean_c"]
    t = log_ratio.theta((sd / mean_t) ** 2, given["n_t"])
    c = log_ratio.theta((sd / mean_c) ** 2, given["n_c"])
    found = log_ratio.first_order(mean_t, mean_c, t, c)
    assert abs(found.y[0] - 0.1871) <= 1.1e-4  # the book's own rounding of the ratio, then its log
    assert abs(found.v[0] - 0.0246) <= 0.5e-4


@pytest.mark.parametrize("arm", ["t", "c"])
def test_small_sample_geary_matches_formula_sheet(arm):
    given, wanted = _inputs("lnrr.geary"), check("lnrr.geary")["expect"]
    found = log_ratio.small_sample_geary(*(given[f"{part}_{arm}"] for part in ("mean", "sd", "n")))
    np.testing.assert_allclose(found, float(wanted[f"Gss_{arm}"]), rtol=ALGEBRA)


def test_small_sample_geary_of_a_doubtful_arm_is_below_three():
    given = _inputs("lnrr.geary_fail")
    found = log_ratio.small_sample_geary(given["mean"], given["sd"], given["n"])
    wanted = float(check("lnrr.geary_fail")["expect"]["Gss"])
    np.testing.assert_allclose(found, wanted, rtol=ALGEBRA)
    assert found[0] < 3


def test_small_sample_geary_is_blank_without_sd_and_infinite_at_zero_sd():
    found = log_ratio.small_sample_geary(
        np.array([2.0, 2.0]), np.array([np.nan, 0.0]), np.array([4.0, 4.0])
    )
    assert np.isnan(found[0])
    assert np.isinf(found[1])


def test_log_ratio_is_blank_without_a_positive_mean():
    found = log_ratio.log_ratio(np.array([1.0, -1.0, 0.0]), np.array([0.0, -2.0, 3.0]))
    assert np.isnan(found).all()


@given(MEAN, MEAN, CV, CV, N, N)
def test_swapping_the_arms_flips_the_sign_only(mean_t, mean_c, cv_t, cv_c, n_t, n_c):
    t, c = _one(cv_t**2 / n_t), _one(cv_c**2 / n_c)
    for compute in (log_ratio.first_order, log_ratio.second_order):
        there = compute(_one(mean_t), _one(mean_c), t, c)
        back = compute(_one(mean_c), _one(mean_t), c, t)
        np.testing.assert_allclose(there.y, -back.y, rtol=ALGEBRA, atol=1e-14)
        np.testing.assert_allclose(there.v, back.v, rtol=ALGEBRA)


@given(MEAN, MEAN, CV, CV, N, N, st.floats(1e-3, 1e3))
def test_unit_does_not_matter(mean_t, mean_c, cv_t, cv_c, n_t, n_c, factor):
    t, c = _one(cv_t**2 / n_t), _one(cv_c**2 / n_c)
    plain = log_ratio.second_order(_one(mean_t), _one(mean_c), t, c)
    other = log_ratio.second_order(_one(mean_t * factor), _one(mean_c * factor), t, c)
    np.testing.assert_allclose(plain.y, other.y, rtol=1e-9, atol=1e-12)


@given(CV, CV, N, N)
def test_second_order_tends_to_first_with_n(cv_t, cv_c, n_t, n_c):
    """The share beyond first order is at most theta / 4 of the larger arm."""
    t, c = _one(cv_t**2 / n_t), _one(cv_c**2 / n_c)
    share = log_ratio.second_order_share(t, c)
    assert 0 <= share[0] <= max(t[0], c[0]) / 2


@given(MEAN, MEAN, CV, CV, N, N)
def test_second_order_against_fifty_digits(mean_t, mean_c, cv_t, cv_c, n_t, n_c):
    with mpmath.workdps(50):
        a = mpmath.mpf(cv_t) ** 2 / n_t
        b = mpmath.mpf(cv_c) ** 2 / n_c
        y = mpmath.log(mpmath.mpf(mean_t) / mpmath.mpf(mean_c)) + (a - b) / 2
        v = a + b + (a**2 + b**2) / 2
    t, c = log_ratio.theta(_one(cv_t**2), _one(n_t)), log_ratio.theta(_one(cv_c**2), _one(n_c))
    found = log_ratio.second_order(_one(mean_t), _one(mean_c), t, c)
    np.testing.assert_allclose(found.v[0], float(v), rtol=ALGEBRA)
    np.testing.assert_allclose(found.y[0], float(y), rtol=ALGEBRA, atol=1e-14)
