"""Random problems for property tests."""

import numpy as np
from hypothesis import strategies as st

from drystone.maths.mixed_model import KnownCovariance, Problem


@st.composite
def problems(draw, *, most_coefficients: int = 3, most_studies: int = 12) -> Problem:
    """Unbalanced studies, within- and between-study moderators, shared-control covariances."""
    seed = draw(st.integers(0, 2**32 - 1))
    random = np.random.default_rng(seed)
    width = draw(st.integers(1, most_coefficients))
    sizes = draw(st.lists(st.integers(1, 5), min_size=width + 2, max_size=most_studies))
    sizes[0] = max(sizes[0], 3)
    study = random.permutation(np.repeat(np.arange(len(sizes)), sizes))
    variances = 10.0 ** random.uniform(-draw(st.integers(0, 3)), 0.5, len(study))
    between, within = draw(st.sampled_from([0.0, 0.05, 1.0])), draw(st.sampled_from([0.0, 0.2]))
    X = np.column_stack([np.ones(len(study)), random.normal(size=(len(study), width - 1))])
    if width > 2:
        X[:, 2] = random.normal(size=len(sizes))[study]
    y = 0.3 + np.sqrt(between) * random.normal(size=len(sizes))[study]
    y += random.normal(size=len(study)) * np.sqrt(variances + within)
    known = _shared_controls(variances, study, random)
    return Problem(y, X, tuple(f"b{k}" for k in range(width)), study, known)


def _shared_controls(
    variances: np.ndarray, study: np.ndarray, random: np.random.Generator
) -> KnownCovariance:
    """One common part of up to 90 % of the smallest variance in about half of the studies."""
    pairs = []
    for code in np.unique(study):
        rows = np.flatnonzero(study == code)
        if len(rows) > 1 and random.random() < 0.5:
            common = random.uniform(0.1, 0.9) * variances[rows].min()
            rows = rows[: random.integers(2, len(rows) + 1)]
            pairs += [(i, j, common) for k, i in enumerate(rows) for j in rows[k + 1 :]]
    i, j, value = np.array(pairs).T if pairs else np.empty((3, 0))
    return KnownCovariance(variances, i.astype(int), j.astype(int), value)
