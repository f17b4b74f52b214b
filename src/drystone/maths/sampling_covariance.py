"""Sampling covariance of comparisons that share a physical arm.

A comparison is ln(treatment) - ln(control). So two comparisons share the variance of a log mean
for every arm that they have in common: with a plus sign in the same role, with a minus sign in
opposite roles (the treatment of one is the control of the other).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]
Codes = NDArray[np.int64]


@dataclass(frozen=True)
class Pairs:
    """Off-diagonal entries: rows ``i`` < ``j`` (m,) and their covariance (m,)."""

    i: Codes
    j: Codes
    covariance: Array


def shared_arm_covariance(
    treatment_arm: Codes, control_arm: Codes, treatment_variance: Array, control_variance: Array
) -> Pairs:
    """Covariances between all pairs of rows that share at least one arm.

    Parameters
    ----------
    treatment_arm, control_arm : (k,) codes of the physical arms; one code, one arm
    treatment_variance, control_variance : (k,) variance of the log mean of each row's arms;
        equal wherever the code is equal

    Returns
    -------
    Pairs
        Sorted by i, then j; pairs without a shared arm are absent.

    References
    ----------
    Lajeunesse (2011) Ecology 92:2049-2055 for shared controls; the signs for chains follow from
    Cov(ln a - ln c, ln b - ln a) = -Var(ln a).
    """
    k = len(treatment_arm)
    rows = np.concatenate([np.arange(k), np.arange(k)])
    arms = np.concatenate([treatment_arm, control_arm])
    signs = np.concatenate([np.ones(k), -np.ones(k)])
    variances = np.concatenate([treatment_variance, control_variance])
    order = np.argsort(arms, kind="stable")
    cuts = np.flatnonzero(np.diff(arms[order])) + 1
    pieces = [
        _pairs_of_one_arm(rows[group], signs[group], variances[group])
        for group in np.split(order, cuts)
        if len(group) > 1
    ]
    return _summed(pieces, k)


def _pairs_of_one_arm(rows: Codes, signs: Array, variances: Array) -> tuple[Codes, Codes, Array]:
    a, b = np.triu_indices(len(rows), 1)
    low, high = np.minimum(rows[a], rows[b]), np.maximum(rows[a], rows[b])
    covariance = signs[a] * signs[b] * variances[a]
    apart = low != high
    return low[apart], high[apart], covariance[apart]


def _summed(pieces: list[tuple[Codes, Codes, Array]], k: int) -> Pairs:
    if not pieces:
        none = np.zeros(0, dtype=np.int64)
        return Pairs(none, none, np.zeros(0))
    i, j, covariance = (np.concatenate(part) for part in zip(*pieces, strict=True))
    keys, where = np.unique(i * k + j, return_inverse=True)
    total = np.zeros(len(keys))
    np.add.at(total, where, covariance)
    return Pairs(keys // k, keys % k, total)
