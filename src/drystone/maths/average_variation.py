"""Average coefficient of variation over the physical arms that report an SD.

Each physical arm comes once: a shared control counts as one arm, however many rows use it.
All arrays are (m,), one entry per physical arm. CV^2 is a ratio of variances, unitless.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

FEWEST_ARMS = 10  # below this an average by arm and outcome is pooled upward
DOMINATING_SHARE = 0.25  # share of the sum that one arm may own before it is named
SPREAD_OF_VERSIONS = 1.5  # ratio of the largest to the smallest version that is worth a warning
GEARY_LIMIT = 3.0


@dataclass(frozen=True)
class Share:
    """The arm that owns most of an average: its index and its share of the sum."""

    index: int
    share: float


def square_of_mean(cv: Array, n: Array) -> float:
    """Square of the n-weighted mean CV: the weighted average CV that is plugged in.

    References
    ----------
    Nakagawa et al. (2023) Ecol Lett 26:232-244, doi 10.1111/ele.14144 (reading from memory).
    """
    return float((np.sum(n * cv) / np.sum(n)) ** 2)


def mean_of_squares(cv: Array, n: Array) -> float:
    """n-weighted mean of the squared CVs; at least as large as `square_of_mean` (Jensen).

    References
    ----------
    Doncaster & Spake (2018) Methods Ecol Evol 9:634-644 (in spirit; unweighted there).
    """
    return float(np.sum(n * cv**2) / np.sum(n))


def winsorised_mean_of_squares(cv: Array, n: Array, quantile: float = 0.99) -> float:
    """As `mean_of_squares`, with CVs above the ``quantile`` pulled down to it."""
    return mean_of_squares(np.minimum(cv, np.quantile(cv, quantile)), n)


def shrunken_mean_of_squares(cv: Array, n: Array) -> float:
    """As `mean_of_squares`, each CV^2 shrunk to CV^2 / (1 + 3 CV^2 / n) against plug-in noise."""
    cv2 = cv**2
    return float(np.sum(n * cv2 / (1 + 3 * cv2 / n)) / np.sum(n))


def square_of_median(cv: Array, n: Array) -> float:
    """Square of the n-weighted median CV, which no single arm can own."""
    order = np.argsort(cv, kind="stable")
    reached = np.cumsum(n[order]) - n[order] / 2
    middle = np.interp(np.sum(n) / 2, reached, cv[order])
    return float(middle**2)


def normal_enough(cv: Array, n: Array) -> NDArray[np.bool_]:
    """Arms (m,) whose small-sample Geary value reaches 3."""
    return np.asarray(4 * n**1.5 / (1 + 4 * n) >= GEARY_LIMIT * cv)


def largest_share(cv: Array, n: Array, version: str) -> Share:
    """Arm that contributes most to the average.

    Parameters
    ----------
    version : 'square of mean' (shares of sum n CV) or 'mean of squares' (shares of sum n CV^2)
    """
    parts = n * cv if version == "square of mean" else n * cv**2
    total = float(np.sum(parts))
    index = int(np.argmax(parts))
    return Share(index, float(parts[index]) / total if total > 0 else 0.0)


VERSIONS = {
    "square of mean": square_of_mean,
    "mean of squares": mean_of_squares,
    "mean of squares, winsorised at 99 %": winsorised_mean_of_squares,
    "mean of squares, shrunken": shrunken_mean_of_squares,
    "square of median": square_of_median,
}


def all_versions(cv: Array, n: Array) -> dict[str, float]:
    """Every version of the average, by name, and the plain ones without doubtful arms.

    Parameters
    ----------
    cv, n : (m,) CV and replicates of each reporting physical arm; m >= 1
    """
    found = {name: function(cv, n) for name, function in VERSIONS.items()}
    fit = normal_enough(cv, n)
    for name in ("square of mean", "mean of squares"):
        if fit.any():
            found[f"{name}, arms that pass the normal check"] = VERSIONS[name](cv[fit], n[fit])
    return found
