"""Large clusters are adjusted by quadrature; it must agree with the dense adjustment."""

import sys

import numpy as np
import pytest

from drystone.maths.mixed_model import KnownCovariance, Problem, cluster_robust, fit, prepare
from drystone.maths.mixed_model.adjust_large import _nodes, adjust_large
from drystone.maths.mixed_model.adjust_small import adjust_small
from drystone.maths.mixed_model.criterion import evaluate


def _problem(*, spread: float = 1.0, own: bool = False, sizes=(90, 60, 9, 50, 3)) -> Problem:
    random = np.random.default_rng(11)
    study = np.repeat(np.arange(len(sizes)), sizes)
    rows = len(study)
    v = 10.0 ** random.uniform(-spread, 0, rows) / 5
    X = np.column_stack([np.ones(rows), random.normal(size=rows)])
    if own:  # a moderator that occurs in the first study only
        X = np.column_stack([X, (study == 0) * random.normal(size=rows)])
    y = 0.3 * random.normal(size=len(sizes))[study] + random.normal(size=rows) * np.sqrt(v)
    i = np.flatnonzero((np.arange(rows - 1) % 3 == 0) & (study[1:] == study[:-1]))
    known = KnownCovariance(v, i, i + 1, 0.7 * np.minimum(v[i], v[i + 1]))
    return Problem(y, X, tuple("abc"[: X.shape[1]]), study, known)


@pytest.mark.parametrize(
    ("spread", "theta", "digits"),
    [(1.0, (0.2, 0.1), 12), (1.0, (0.0, 0.0), 12), (4.0, (0.5, 0.0), 9), (2.0, (50.0, 1e-3), 9)],
)
@pytest.mark.parametrize("own", [False, True])
def test_quadrature_agrees_with_dense_matrices(spread, theta, digits, own):
    prepared = prepare(_problem(spread=spread, own=own))
    at = evaluate(prepared, np.array(theta), "REML")
    half = np.linalg.inv(at.factor)
    for rows in (np.arange(90)[None], np.arange(90, 212)[None]):  # one study; four together
        small = adjust_small(prepared, at, half @ half.T, rows)
        large = adjust_large(prepared, at, half @ half.T, rows)
        for found, expected in [
            (large.columns, small.columns),
            (large.variances, small.variances),
        ]:
            scale = np.abs(expected).max()
            np.testing.assert_allclose(found, expected, rtol=0, atol=10.0**-digits * scale)


@pytest.mark.parametrize(
    ("ratio", "digits"), [(0.5, 14), (1e-3, 14), (1e-7, 13), (1e-12, 11), (1e-18, 8)]
)
def test_quadrature_of_the_inverse_root(ratio, digits):
    # the amplitude near a modulus of one loses digits with the fourth root of the ratio
    nodes, weights = _nodes(ratio)
    x = np.geomspace(1.0, 1.0 / ratio, 200)
    found = (weights / (x[:, None] + nodes**2)).sum(axis=1)
    np.testing.assert_allclose(found, x**-0.5, rtol=10.0**-digits)


def test_size_of_the_clusters_decides_nothing(monkeypatch):
    prepared = prepare(_problem())
    fitted = fit(prepared)
    mixed = cluster_robust(prepared, fitted)
    # the package exports a function of the module's name, so the module is taken by its key
    module = sys.modules["drystone.maths.mixed_model.cluster_robust"]
    monkeypatch.setattr(module, "LARGEST_DENSE", 1000)
    dense = cluster_robust(prepared, fitted)
    np.testing.assert_allclose(mixed.covariance, dense.covariance, rtol=1e-10)
    np.testing.assert_allclose(mixed.degrees_of_freedom, dense.degrees_of_freedom, rtol=1e-10)
