"""Combined groups, change scores, SDs that cannot be."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from reference.formula_sheet import check

from drystone.maths import spread_recovery as recover

ALGEBRA = 1e-12
STATED = 1e-10  # rel_tol that checks.json states for computed values


def test_combined_groups_of_the_formula_sheet():
    entry = check("combine.groups")
    groups = np.array([[float(v) for v in group] for group in entry["inputs"]["groups"]])
    found = recover.combine_groups(*groups.T)
    wanted = [float(entry["expect"][name]) for name in ("n", "mean", "sd")]
    np.testing.assert_allclose((found.n, found.mean, found.sd), wanted, rtol=STATED)


@given(st.lists(st.lists(st.floats(-1e3, 1e3), min_size=2, max_size=8), min_size=1, max_size=5))
def test_groups_combine_to_the_numbers_of_all_values(groups):
    found = recover.combine_groups(
        [len(group) for group in groups],
        [np.mean(group) for group in groups],
        [np.std(group, ddof=1) for group in groups],
    )
    values = np.concatenate(groups)
    assert found.n == values.size
    np.testing.assert_allclose(found.mean, values.mean(), rtol=ALGEBRA, atol=1e-10)
    # SDs carry the rounding of values up to 1e3
    np.testing.assert_allclose(found.sd, values.std(ddof=1), rtol=1e-9, atol=1e-10)


def test_a_group_of_one_value_needs_no_sd():
    # by hand: 1, 3 (mean 2, SD sqrt 2) and 8: mean 4, SD sqrt((9 + 1 + 16) / 2)
    found = recover.combine_groups([2, 1], [2.0, 8.0], [np.sqrt(2.0), np.nan])
    np.testing.assert_allclose((found.mean, found.sd), (4.0, np.sqrt(13.0)), rtol=ALGEBRA)
    assert np.isnan(recover.combine_groups([1], [2.0], [0.0]).sd)


@pytest.mark.parametrize(
    "groups",
    [([], [], []), ([2, 3], [1.0], [1.0]), ([0], [1.0], [1.0]), ([2], [1.0], [-1.0])],
)
def test_groups_that_cannot_be_are_refused(groups):
    with pytest.raises(ValueError, match="group"):
        recover.combine_groups(*groups)


def test_correlation_from_changes_printed_in_the_cochrane_handbook():
    # Cochrane Handbook 6.5.2.8: 0.78 and 0.82 (checks.json: from memory)
    entry = check("change.corr.published")
    for arm in ("E", "C"):
        found = recover.correlation_from_changes(*(float(v) for v in entry["inputs"][arm]))
        assert abs(found - float(entry["published"][f"r_{arm}"])) <= 0.5e-2
        np.testing.assert_allclose(found, float(entry["ours"][f"r_{arm}"]), rtol=STATED)


def test_paired_differences_printed_in_the_cochrane_handbook():
    # Cochrane Handbook 5.1, 16.4.6.4: 0.583 and 0.632 (checks.json: read in the stored page)
    entry = check("paired.sd_diff.published")
    se = recover.se_of_mean_change(recover.sd_of_change(2.38, 2.21, 0.68), 10)
    assert abs(se - float(entry["published"]["se"])) <= 0.5e-3
    np.testing.assert_allclose(se, float(entry["ours"]["se"]), rtol=STATED)
    entry = check("paired.se_from_sddiff.published")
    se = recover.se_of_mean_change(2.0, 10)
    assert abs(se - float(entry["published"]["se"])) <= 0.5e-3


@given(st.floats(0.1, 50.0), st.floats(0.1, 50.0), st.floats(-0.99, 0.99))
def test_correlation_comes_back_from_the_sd_of_changes(first, last, r):
    change = recover.sd_of_change(first, last, r)
    found = recover.correlation_from_changes(first, last, change)
    room = 1e-13 * (first / last + last / first)  # the two squares cancel when very unlike
    np.testing.assert_allclose(found, r, atol=1e-12 + room)


@given(st.floats(0.1, 50.0), st.floats(0.1, 50.0), st.floats(0.0, 0.95))
def test_final_sd_comes_back_where_it_is_the_larger_root(first, last, r):
    if last < r * first * 1.001:
        return  # the smaller root
    change = recover.sd_of_change(first, last, r)
    np.testing.assert_allclose(recover.sd_of_final(first, change, r), last, rtol=1e-6)


def test_sds_that_do_not_go_together_have_no_correlation():
    assert np.isnan(recover.correlation_from_changes(1.0, 1.0, 3.0))
    assert recover.correlation_from_changes(2.5, 2.5, 0.0) == 1.0
    assert np.isnan(recover.sd_of_change(1.0, 1.0, 1.2))
    assert np.isnan(recover.sd_of_final(5.0, 1.0, 0.1))


def test_largest_sds_of_the_formula_sheet():
    entry = check("sd.max_bounded")
    found = recover.largest_sd_between(12.0, 0.0, 100.0, 5)
    np.testing.assert_allclose(found, float(entry["expect"]["max_sd"]), rtol=STATED)
    entry = check("sd.max_nonneg")
    found = recover.largest_sd_above_zero(2.0, 4)
    np.testing.assert_allclose(found, float(entry["expect"]["max_sd"]), rtol=STATED)
    entry = check("sd.zero_rounding")
    found = recover.largest_sd_printed_as_zero(entry["inputs"]["decimals"])
    np.testing.assert_allclose(found, float(entry["expect"]["upper"]), rtol=STATED)


@given(st.lists(st.floats(0.0, 100.0), min_size=2, max_size=10))
def test_no_sample_exceeds_the_largest_sd(values):
    mean, sd, n = np.mean(values), np.std(values, ddof=1), len(values)
    room = 1 + 1e-9
    assert sd <= recover.largest_sd_between(min(mean, 100.0), 0.0, 100.0, n) * room + 1e-9
    assert sd <= recover.largest_sd_above_zero(mean, n) * room + 1e-9


def test_means_outside_their_bounds_have_no_largest_sd():
    assert np.isnan(recover.largest_sd_between(120.0, 0.0, 100.0, 5))
    assert np.isnan(recover.largest_sd_between(12.0, 0.0, 100.0, 1))
    assert np.isnan(recover.largest_sd_above_zero(-1.0, 5))
