"""Covariance through shared arms: formula sheet, a dense slow twin, positive definiteness.

Expected numbers: tests/reference/checks.json (invented inputs, mpmath).
"""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from reference.formula_sheet import check

from drystone.maths.log_ratio import log_mean_variance, theta
from drystone.maths.sampling_covariance import shared_arm_covariance


def _theta(arm: dict) -> np.ndarray:
    cv2 = (float(arm["sd"]) / float(arm["mean"])) ** 2
    return theta(np.array([cv2]), np.array([float(arm["n"])]))


@pytest.mark.parametrize(("order", "key"), [("first", "cov_first"), ("second", "cov_second")])
def test_shared_control_matches_formula_sheet(order, key):
    entry = check("lnrr.shared_control")
    control = log_mean_variance(_theta(entry["inputs"]["control"]), order)
    pairs = shared_arm_covariance(
        np.array([1, 2]), np.array([0, 0]), np.array([0.1, 0.2]), np.repeat(control, 2)
    )
    assert (pairs.i.tolist(), pairs.j.tolist()) == ([0], [1])
    np.testing.assert_allclose(pairs.covariance, float(entry["expect"][key]), rtol=1e-12)


@pytest.mark.parametrize(("order", "key"), [("first", "cov_first"), ("second", "cov_second")])
def test_chained_contrast_matches_formula_sheet(order, key):
    """The treatment of one row is the control of the other: the covariance is negative."""
    entry = check("lnrr.chain_contrast")
    middle = log_mean_variance(_theta(entry["inputs"]["A"]), order)[0]
    pairs = shared_arm_covariance(
        np.array([1, 2]), np.array([0, 1]), np.array([middle, 0.3]), np.array([0.2, middle])
    )
    np.testing.assert_allclose(pairs.covariance, float(entry["expect"][key]), rtol=1e-12)


ROWS = st.lists(st.tuples(st.integers(0, 6), st.integers(0, 6)).filter(lambda r: r[0] != r[1]))


@given(ROWS.filter(lambda rows: len(rows) > 0))
def test_against_contrast_matrix(rows):
    """V = C D C' with C the matrix of contrasts and D the variances of the arms' log means."""
    arm_variance = np.linspace(0.05, 0.4, 7)
    treatment, control = (np.array(side) for side in zip(*rows, strict=True))
    contrasts = np.zeros((len(rows), 7))
    contrasts[np.arange(len(rows)), treatment] = 1
    contrasts[np.arange(len(rows)), control] = -1
    dense = contrasts @ np.diag(arm_variance) @ contrasts.T
    pairs = shared_arm_covariance(
        treatment, control, arm_variance[treatment], arm_variance[control]
    )
    built = np.diag(arm_variance[treatment] + arm_variance[control])
    built[pairs.i, pairs.j] = built[pairs.j, pairs.i] = pairs.covariance
    np.testing.assert_allclose(built, dense, atol=1e-15)
    assert np.linalg.eigvalsh(built).min() > -1e-12


def test_no_shared_arm_gives_no_pair():
    pairs = shared_arm_covariance(
        np.array([0, 1]), np.array([2, 3]), np.array([0.1, 0.1]), np.array([0.2, 0.2])
    )
    assert len(pairs.i) == len(pairs.j) == len(pairs.covariance) == 0
