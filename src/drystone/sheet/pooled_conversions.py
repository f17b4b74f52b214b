"""Spreads of both arms together that become one SD: table errors, tests, limits of a difference.

`BY_POOLED_KIND` and `BY_TEST_KIND` are registries as `conversions.BY_KIND` is; `FROM_DIFFERENCE`
needs no kind. All give the residual SD of one replicate, the same for both arms.
"""

from __future__ import annotations

import numpy as np

from drystone.maths import spread_recovery as recover
from drystone.sheet.conversion import (
    Conversion,
    Mask,
    PairNumbers,
    Refusals,
    given,
    usable_level,
)
from drystone.words import spreads

ROUND_P = (0.1, 0.05, 0.01, 0.005, 0.001, 0.0005, 0.0001)
_BOTH_N = ("control_n", "treatment_n")
_BOTH = ("control_mean", "control_n", "treatment_mean", "treatment_n")
_COMMON = "both arms have the same SD"
_TABLE = _COMMON + ", that of the error of the analysis of variance"
_TEST = _COMMON + "; the test compares these two arms alone, on the scale of the means"
_UNEQUAL = "; unequal n enter as 1/n1 + 1/n2"


def _pooled_given(pair: PairNumbers) -> Mask:
    return given(pair.pooled_spread)


def _test_given(pair: PairNumbers) -> Mask:
    return given(pair.test_value)


def _difference_given(pair: PairNumbers) -> Mask:
    return given(pair.difference_lower, pair.difference_upper)


def _negative(pair: PairNumbers) -> Refusals:
    yield "a spread cannot be negative", pair.pooled_spread < 0


def _significant_refused(pair: PairNumbers) -> Refusals:
    yield from _negative(pair)
    yield "error_df is below one", pair.error_df < 1
    yield "the level (100 - alpha in percent) is unusable", ~usable_level(pair)


def _hsd_refused(pair: PairNumbers) -> Refusals:
    yield from _significant_refused(pair)
    means = pair.number_of_means
    whole = (means == np.floor(means)) & (means >= 2) & (means <= 1000)
    yield "number_of_means is no whole number from 2 to 1000", ~np.isnan(means) & ~whole


def _table_cv_refused(pair: PairNumbers) -> Refusals:
    yield from _negative(pair)
    yield "the grand mean is not above zero", pair.grand_mean <= 0
    yield "a CV% of logarithms says nothing about the values", pair.on_logs


def _test_refused(pair: PairNumbers) -> Refusals:
    equal = pair.control_mean == pair.treatment_mean
    yield "the means are equal, so a test of their difference holds no SD", equal


def _t_refused(pair: PairNumbers) -> Refusals:
    yield from _test_refused(pair)
    yield "a statistic of zero holds no SD", pair.test_value == 0


def _f_refused(pair: PairNumbers) -> Refusals:
    yield from _t_refused(pair)
    yield "F cannot be negative", pair.test_value < 0
    several = ~np.isnan(pair.number_of_means) & (pair.number_of_means != 2)
    yield "F of more than two means is no test of these two arms", several


def _p_refused(pair: PairNumbers) -> Refusals:
    p = pair.test_value
    yield "p does not lie between 0 and 1", ~((p > 0) & (p < 1))
    yield "p is a round limit, as in 'p < 0.05', and so only a bound", np.isin(p, ROUND_P)
    yield from _test_refused(pair)
    yield from _df_refused(pair)


def _difference_refused(pair: PairNumbers) -> Refusals:
    below = pair.difference_lower < pair.difference_upper
    yield "the lower limit of the difference is not below the upper limit", ~below
    yield "the level of the interval is unusable", ~usable_level(pair)
    yield from _df_refused(pair)


def _df_refused(pair: PairNumbers) -> Refusals:
    unknown = np.isnan(pair.test_df) & np.isnan(pair.error_df)
    yield "the design is not two independent arms, so error_df is needed: fill it in", unknown
    yield "the degrees of freedom are below one", pair.test_df < 1


BY_POOLED_KIND: dict[str, Conversion[PairNumbers]] = {
    spreads.POOLED_SD: Conversion(
        "pooled SD",
        ("pooled_spread",),
        "the pooled SD itself",
        _COMMON,
        lambda pair: pair.pooled_spread,
        _pooled_given,
        _negative,
    ),
    spreads.MSE: Conversion(
        "from MSE",
        ("pooled_spread",),
        "square root of the error mean square",
        _TABLE,
        lambda pair: recover.sd_from_mse(pair.pooled_spread),
        _pooled_given,
        _negative,
    ),
    spreads.SEM: Conversion(
        "from SEM",
        ("pooled_spread", *_BOTH_N),
        "SEM x sqrt(n)",
        _TABLE + "; unequal n enter by their harmonic mean",
        lambda pair: recover.sd_from_sem(pair.pooled_spread, pair.control_n, pair.treatment_n),
        _pooled_given,
        _negative,
    ),
    spreads.SED: Conversion(
        "from SED",
        ("pooled_spread", *_BOTH_N),
        "SED x sqrt(n / 2)",
        _TABLE + _UNEQUAL,
        lambda pair: recover.sd_from_sed(pair.pooled_spread, pair.control_n, pair.treatment_n),
        _pooled_given,
        _negative,
    ),
    spreads.LSD: Conversion(
        "from LSD",
        ("pooled_spread", *_BOTH_N, "error_df", "confidence_percent"),
        "LSD / t(error_df) x sqrt(n / 2)",
        _TABLE + _UNEQUAL + "; in a split plot, of the stratum of this comparison",
        lambda pair: recover.sd_from_lsd(
            pair.pooled_spread,
            pair.control_n,
            pair.treatment_n,
            pair.error_df,
            pair.confidence_percent,
        ),
        _pooled_given,
        _significant_refused,
        needs=("error_df",),
    ),
    spreads.HSD: Conversion(
        "from HSD",
        ("pooled_spread", *_BOTH_N, "number_of_means", "error_df", "confidence_percent"),
        "HSD / q(number_of_means, error_df) x sqrt(n)",
        _TABLE + _UNEQUAL + "; q is the studentised range",
        lambda pair: recover.sd_from_hsd(
            pair.pooled_spread,
            pair.control_n,
            pair.treatment_n,
            pair.number_of_means,
            pair.error_df,
            pair.confidence_percent,
        ),
        _pooled_given,
        _hsd_refused,
        needs=("number_of_means", "error_df"),
    ),
    spreads.TABLE_CV_PERCENT: Conversion(
        "from CV% of the grand mean",
        ("pooled_spread", "grand_mean"),
        "CV% x grand mean / 100",
        _TABLE,
        lambda pair: recover.sd_from_table_cv_percent(pair.pooled_spread, pair.grand_mean),
        _pooled_given,
        _table_cv_refused,
        needs=("grand_mean",),
    ),
}
BY_TEST_KIND: dict[str, Conversion[PairNumbers]] = {
    spreads.T: Conversion(
        "from t",
        ("test_value", *_BOTH),
        "|difference of means| / (t sqrt(1/n1 + 1/n2))",
        _TEST,
        lambda pair: recover.sd_from_t(*_two_arms(pair), pair.test_value),
        _test_given,
        _t_refused,
    ),
    spreads.F: Conversion(
        "from F",
        ("test_value", *_BOTH, "number_of_means"),
        "|difference of means| / (sqrt(F) sqrt(1/n1 + 1/n2))",
        _TEST + "; F has one degree of freedom in its numerator",
        lambda pair: recover.sd_from_f(*_two_arms(pair), pair.test_value),
        _test_given,
        _f_refused,
        needs=("number_of_means",),
    ),
    spreads.P: Conversion(
        "from p",
        ("test_value", *_BOTH, "error_df"),
        "|difference of means| / (t sqrt(1/n1 + 1/n2)), t the quantile that belongs to p",
        _TEST + "; p is exact and two-sided",
        lambda pair: recover.sd_from_p(*_two_arms(pair), pair.test_value, pair.test_df),
        _test_given,
        _p_refused,
    ),
}
FROM_DIFFERENCE: Conversion[PairNumbers] = Conversion(
    "from CI of the difference",
    ("difference_lower", "difference_upper", *_BOTH_N, "error_df", "confidence_percent"),
    "(upper - lower) / (2 t sqrt(1/n1 + 1/n2))",
    _COMMON + "; the interval is difference +- t SE, on the scale of the means",
    lambda pair: recover.sd_from_difference_limits(
        pair.difference_lower,
        pair.difference_upper,
        pair.control_n,
        pair.treatment_n,
        pair.confidence_percent,
        pair.test_df,
    ),
    _difference_given,
    _difference_refused,
)


def _two_arms(pair: PairNumbers) -> tuple[np.ndarray, np.ndarray, np.ndarray, np.ndarray]:
    return pair.control_mean, pair.treatment_mean, pair.control_n, pair.treatment_n
