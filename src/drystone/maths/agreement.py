"""Agreement of two people who sort the same things into categories."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray


def cohen_kappa(first: NDArray[np.int64], second: NDArray[np.int64]) -> float:
    """Agreement beyond chance: 1 is full agreement, 0 what chance alone would give.

    Parameters
    ----------
    first, second : (k,) category of each thing, as numbers from 0, by each person

    Returns
    -------
    float
        NaN without things, or when both use one and the same category throughout.

    References
    ----------
    Cohen (1960) Educational and Psychological Measurement 20:37-46.
    """
    if len(first) == 0:
        return float("nan")
    size = int(max(first.max(), second.max())) + 1
    observed = float(np.mean(first == second))
    shares = [np.bincount(codes, minlength=size) / len(codes) for codes in (first, second)]
    by_chance = float(shares[0] @ shares[1])
    return float("nan") if by_chance == 1 else (observed - by_chance) / (1 - by_chance)
