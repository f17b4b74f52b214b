"""Average CV: formula sheet, inequalities, shares.

Expected numbers: tests/reference/checks.json `sheet.average_cv2` (invented sheet, mpmath).
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as arrays
from reference.formula_sheet import check, sheet

from drystone.maths import average_variation as variation

ARMS = st.integers(1, 30).flatmap(
    lambda m: st.tuples(
        arrays.arrays(float, m, elements=st.floats(0.01, 2)),
        arrays.arrays(float, m, elements=st.integers(2, 60).map(float)),
    )
)


def _unique_arms(side: str) -> tuple[np.ndarray, np.ndarray]:
    rows = [dict(zip(sheet()["columns"], row, strict=True)) for row in sheet()["rows"]]
    arms = {
        row[f"arm_{side}"]: (
            float(row[f"sd_{side}"]) / float(row[f"mean_{side}"]),
            row[f"n_{side}"],
        )
        for row in rows
        if row[f"sd_{side}"]
    }
    cv, n = zip(*arms.values(), strict=True)
    return np.array(cv), np.array(n, dtype=float)


@pytest.mark.parametrize(
    ("side", "key"), [("t", "nweighted_T"), ("c", "unique_control_nweighted_C")]
)
def test_mean_of_squares_matches_formula_sheet(side, key):
    wanted = float(check("sheet.average_cv2")["expect"][key])
    assert variation.mean_of_squares(*_unique_arms(side)) == pytest.approx(wanted, rel=1e-12)


def test_square_of_mean_matches_formula_sheet():
    wanted = float(check("sheet.average_cv2")["expect"]["square_of_nweighted_CV_T"])
    assert variation.square_of_mean(*_unique_arms("t")) == pytest.approx(wanted, rel=1e-12)


@given(ARMS)
def test_square_of_mean_is_never_above_mean_of_squares(arms):
    """Jensen's inequality."""
    assert variation.square_of_mean(*arms) <= variation.mean_of_squares(*arms) * (1 + 1e-12)


@given(st.floats(0.01, 2), st.integers(1, 20))
def test_equal_cvs_give_the_same_plain_versions(cv, m):
    arms = np.full(m, cv), np.arange(2.0, 2.0 + m)
    found = variation.all_versions(*arms)
    for name in ("square of mean", "mean of squares", "square of median"):
        assert found[name].cv2 == pytest.approx(cv**2, rel=1e-9)


@given(ARMS)
def test_versions_do_not_depend_on_the_order_of_arms(arms):
    cv, n = arms
    there, back = variation.all_versions(cv, n), variation.all_versions(cv[::-1], n[::-1])
    assert there.keys() == back.keys()
    for name, value in there.items():
        if name != "square of median":  # ties may fall on either side of the middle
            assert value.cv2 == pytest.approx(back[name].cv2, rel=1e-9)


@given(ARMS)
def test_largest_share_is_a_share_of_the_sum(arms):
    for version in variation.all_versions(*arms).values():
        if version.top is not None:
            assert 1 / version.arms - 1e-12 <= version.top.share <= 1 + 1e-12


def test_one_arm_near_zero_mean_owns_the_mean_of_squares():
    """Eleven plain arms and one with CV 9: 81 of 81 + 11 x .09, and 9 of 9 + 11 x .3."""
    cv, n = np.r_[np.full(11, 0.3), 9.0], np.full(12, 5.0)
    found = variation.all_versions(cv, n)
    squares, mean = found["mean of squares"].top, found["square of mean"].top
    assert (squares.index, squares.share) == (11, pytest.approx(81 / (81 + 11 * 0.09), rel=1e-12))
    assert (mean.index, mean.share) == (11, pytest.approx(9 / (9 + 11 * 0.3), rel=1e-12))
    passing = found["mean of squares, arms that pass the normal check"]
    assert (passing.arms, passing.cv2) == (11, pytest.approx(0.09, rel=1e-12))


def test_average_without_a_passing_arm_has_no_such_version():
    found = variation.all_versions(np.array([4.0, 5.0]), np.array([3.0, 3.0]))
    assert not any("pass" in name for name in found)


def test_normal_check_limit_is_three():
    """4 n^1.5 / (1 + 4 n) / CV at n = 7 and SD / mean = 1.9 / 2.1 is 2.82 (`lnrr.geary_fail`)."""
    assert variation.normal_enough(np.array([1.9 / 2.1, 0.5]), np.array([7.0, 7.0])).tolist() == [
        False,
        True,
    ]
