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
    for name in ("square of mean", "mean of squares", "square of median"):
        assert variation.VERSIONS[name](*arms) == pytest.approx(cv**2, rel=1e-9)


@given(ARMS)
def test_versions_do_not_depend_on_the_order_of_arms(arms):
    cv, n = arms
    there, back = variation.all_versions(cv, n), variation.all_versions(cv[::-1], n[::-1])
    assert there.keys() == back.keys()
    for name, value in there.items():
        if name != "square of median":  # ties may fall on either side of the middle
            assert value == pytest.approx(back[name], rel=1e-9)


@given(ARMS, st.sampled_from(["square of mean", "mean of squares"]))
def test_largest_share_is_a_share_of_the_sum(arms, version):
    top = variation.largest_share(*arms, version)
    assert 1 / len(arms[0]) - 1e-12 <= top.share <= 1 + 1e-12


def test_one_arm_near_zero_mean_owns_the_mean_of_squares():
    """Eleven plain arms and one with CV 9: 81 of 81 + 11 x .09."""
    cv, n = np.r_[np.full(11, 0.3), 9.0], np.full(12, 5.0)
    top = variation.largest_share(cv, n, "mean of squares")
    assert (top.index, top.share) == (11, pytest.approx(81 / (81 + 11 * 0.09), rel=1e-12))


def test_normal_check_limit_is_three():
    """4 n^1.5 / (1 + 4 n) / CV at n = 7 and SD / mean = 1.9 / 2.1 is 2.82 (`lnrr.geary_fail`)."""
    assert variation.normal_enough(np.array([1.9 / 2.1, 0.5]), np.array([7.0, 7.0])).tolist() == [
        False,
        True,
    ]
