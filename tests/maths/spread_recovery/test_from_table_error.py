"""SDs from MSE, SEM, SED, LSD, HSD and the CV% of a table; quantiles of the studentised range."""

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from reference.formula_sheet import check

from drystone.maths import log_ratio
from drystone.maths import spread_recovery as recover

ALGEBRA = 1e-12
STATED = 1e-10  # rel_tol that checks.json states for computed values

positive = st.floats(1e-3, 1e3)
counts = st.integers(2, 60)
errors = st.integers(1, 200)


def test_mse_sem_sed_of_the_formula_sheet():
    entry = check("sd.from_mse_sem_sed")
    mse, sem, sed = (float(entry["inputs"][name]) for name in ("mse", "sem", "sed"))
    found = [
        recover.sd_from_mse(mse),
        recover.sd_from_sem(sem, 4, 4),
        recover.sd_from_sed(sed, 4, 4),
    ]
    wanted = [float(entry["expect"][f"sd_from_{name}"]) for name in ("mse", "sem", "sed")]
    np.testing.assert_allclose(found, wanted, rtol=STATED)


@pytest.mark.parametrize("name", ["sd.from_lsd", "sd.from_lsd_wrong_design"])
def test_lsd_of_the_formula_sheet(name):
    entry = check(name)
    lsd, df = float(entry["inputs"]["lsd"]), entry["inputs"]["df_error"]
    found = recover.sd_from_lsd(lsd, 4, 4, df, 95.0)
    np.testing.assert_allclose(found, float(entry["expect"]["sd"]), rtol=STATED)
    if "t" in entry["expect"]:
        t = recover.t_quantile_of_df(df, 95.0)
        np.testing.assert_allclose(t, float(entry["expect"]["t"]), rtol=STATED)
        np.testing.assert_allclose(lsd / t, float(entry["expect"]["sed"]), rtol=STATED)
        np.testing.assert_allclose(found**2, float(entry["expect"]["mse"]), rtol=STATED)


def test_table_cv_of_the_formula_sheet():
    entry = check("sd.from_cv")
    cv, grand = (float(entry["inputs"][name]) for name in ("cv_percent", "grand_mean"))
    found = recover.sd_from_table_cv_percent(cv, grand)
    np.testing.assert_allclose(found, float(entry["expect"]["sd_anova_cv"]), rtol=STATED)


def test_pooled_sd_of_the_formula_sheet():
    entry = check("sd.pooled_vs_per_group")
    given_, expected = entry["inputs"], entry["expect"]
    mean_t, sd_t, mean_c, sd_c = (float(given_[k]) for k in ("mean_t", "sd_t", "mean_c", "sd_c"))
    pooled = recover.pooled_sd(sd_t, 6, sd_c, 5)
    np.testing.assert_allclose(pooled, float(expected["sp"]), rtol=STATED)

    def variance(one, other):
        thetas = log_ratio.theta((one / mean_t) ** 2, 6), log_ratio.theta((other / mean_c) ** 2, 5)
        return log_ratio.first_order(mean_t, mean_c, *thetas).v

    np.testing.assert_allclose(variance(pooled, pooled), float(expected["v_pooled"]), rtol=STATED)
    np.testing.assert_allclose(variance(sd_t, sd_c), float(expected["v_separate"]), rtol=STATED)


@given(positive, counts, counts, errors, st.floats(60.0, 99.9))
def test_true_sd_comes_back(sd, n1, n2, df, percent):
    sed = sd * np.sqrt(1 / n1 + 1 / n2)
    lsd = sed * recover.t_quantile_of_df(df, percent)
    np.testing.assert_allclose(recover.sd_from_mse(sd * sd), sd, rtol=ALGEBRA)
    np.testing.assert_allclose(recover.sd_from_sem(sd / np.sqrt(n1), n1, n1), sd, rtol=ALGEBRA)
    np.testing.assert_allclose(recover.sd_from_sed(sed, n1, n2), sd, rtol=ALGEBRA)
    np.testing.assert_allclose(recover.sd_from_lsd(lsd, n1, n2, df, percent), sd, rtol=ALGEBRA)
    np.testing.assert_allclose(
        recover.sd_from_table_cv_percent(100 * sd / 7.5, 7.5), sd, rtol=ALGEBRA
    )


@settings(max_examples=25, deadline=None)  # each example integrates a dozen times
@given(positive, counts, counts, st.integers(2, 40), errors)
def test_true_sd_comes_back_from_hsd(sd, n1, n2, means, df):
    q = recover.studentised_range_quantile(means, df, 95.0)
    hsd = q * sd * np.sqrt((1 / n1 + 1 / n2) / 2)
    found = recover.sd_from_hsd(hsd, n1, n2, means, df, 95.0)
    np.testing.assert_allclose(found, sd, rtol=ALGEBRA)


@given(positive, positive, counts, counts)
def test_pooled_sd_lies_between_the_two(sd1, sd2, n1, n2):
    found = float(recover.pooled_sd(sd1, n1, sd2, n2))
    room = 1 + ALGEBRA
    assert min(sd1, sd2) / room <= found <= max(sd1, sd2) * room
    np.testing.assert_allclose(recover.pooled_sd(sd1, n1, sd1, n2), sd1, rtol=ALGEBRA)


@given(positive, errors)
def test_hsd_of_two_means_is_an_lsd(sd, df):
    # q of two means is sqrt(2) t (Tukey 1953): the range of two values is |x1 - x2|
    q = recover.studentised_range_quantile(2, df, 95.0)
    t = recover.t_quantile_of_df(df, 95.0)
    np.testing.assert_allclose(q, np.sqrt(2.0) * t, rtol=2e-12)  # measured: 1e-13 and less


@pytest.mark.parametrize(
    ("means", "df", "printed"),
    # Upper 5 % points of the studentised range as in Steel & Torrie's and other textbooks' tables,
    # two decimals, from memory
    [(3, 10, 3.88), (5, 12, 4.51), (4, 20, 3.96), (3, 5, 4.60), (10, 20, 5.01), (2, 60, 2.83)],
)
def test_studentised_range_of_printed_tables(means, df, printed):
    assert abs(recover.studentised_range_quantile(means, df, 95.0) - printed) <= 0.5e-2


@pytest.mark.parametrize("percent", [90.0, 95.0, 99.0])
@pytest.mark.parametrize(("means", "df"), [(3, 2), (5, 12), (12, 4), (30, 60), (8, 900)])
def test_studentised_range_against_scipy(means, df, percent):
    # scipy.stats.studentized_range is too slow to import for a run, and another method (its
    # integrals are adaptive, to about 1e-10)
    from scipy.stats import studentized_range

    wanted = studentized_range.ppf(percent / 100, means, df)
    found = recover.studentised_range_quantile(means, df, percent)
    np.testing.assert_allclose(found, wanted, rtol=1e-9)


def test_studentised_range_with_many_df_is_the_plain_range():
    # P(range of two < r) = 2 Phi(r / sqrt 2) - 1, at r = sqrt 2 x 1.95996398454005 (checks.json,
    # sd.from_ci_one_mean): 0.95
    found = recover.studentised_range_cdf(np.sqrt(2.0) * 1.95996398454005, 2, np.inf)
    np.testing.assert_allclose(found, 0.95, rtol=ALGEBRA)


def test_numbers_that_cannot_be_give_no_sd():
    assert np.isnan(recover.sd_from_lsd(1.0, 4, 4, 0.0, 95.0))
    assert np.isnan(recover.sd_from_lsd(1.0, 4, 4, 12, [100.0, 0.0, np.nan])).all()
    assert np.isnan(recover.sd_from_hsd(1.0, 4, 4, [1.0, 2.5, np.nan, 2000.0], 12, 95.0)).all()
    assert np.isnan(recover.sd_from_sem(1.0, [0.0, np.nan], 4)).all()
    assert np.isnan(recover.pooled_sd(1.0, 1, 1.0, 1))
