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


def winsorised(cv: Array, quantile: float = 0.99) -> Array:
    """CVs (m,) with those above the ``quantile`` pulled down to it."""
    return np.minimum(cv, np.quantile(cv, quantile))


def shrunken(cv: Array, n: Array) -> Array:
    """CVs (m,) whose squares are shrunk to CV^2 / (1 + 3 CV^2 / n), against plug-in noise."""
    found: Array = cv / np.sqrt(1 + 3 * cv**2 / n)
    return found


def square_of_median(cv: Array, n: Array) -> float:
    """Square of the n-weighted median CV, which no single arm can own."""
    order = np.argsort(cv, kind="stable")
    reached = np.cumsum(n[order]) - n[order] / 2
    middle = np.interp(np.sum(n) / 2, reached, cv[order])
    return float(middle**2)


def normal_enough(cv: Array, n: Array) -> NDArray[np.bool_]:
    """Arms (m,) whose small-sample Geary value reaches 3."""
    return np.asarray(4 * n**1.5 / (1 + 4 * n) >= GEARY_LIMIT * cv)


def largest_share(parts: Array) -> Share:
    """Arm that contributes most to a sum.

    Parameters
    ----------
    parts : (m,) contributions, not negative: n CV for a mean CV, n CV^2 for a mean squared CV
    """
    total = float(np.sum(parts))
    index = int(np.argmax(parts))
    return Share(index, float(parts[index]) / total if total > 0 else 0.0)


@dataclass(frozen=True)
class Version:
    """One way to take the average squared CV.

    Parameters
    ----------
    cv2 : the average
    top : the arm that owns most of it; None for the median, which no arm owns
    arms : number of arms that went in
    """

    cv2: float
    top: Share | None
    arms: int


SQUARE_OF_MEAN, MEAN_OF_SQUARES = "square of mean", "mean of squares"


def all_versions(cv: Array, n: Array) -> dict[str, Version]:
    """Every version of the average, by name, and the plain ones without doubtful arms.

    Parameters
    ----------
    cv, n : (m,) CV and replicates of each reporting physical arm; m >= 1
    """
    fit = np.flatnonzero(normal_enough(cv, n))
    found = {
        SQUARE_OF_MEAN: _of_mean(cv, n),
        MEAN_OF_SQUARES: _of_squares(cv, n),
        f"{MEAN_OF_SQUARES}, winsorised at 99 %": _of_squares(winsorised(cv), n),
        f"{MEAN_OF_SQUARES}, shrunken": _of_squares(shrunken(cv, n), n),
        "square of median": Version(square_of_median(cv, n), None, len(cv)),
    }
    if len(fit):
        passing = "arms that pass the normal check"
        found[f"{SQUARE_OF_MEAN}, {passing}"] = _of_mean(cv, n, fit)
        found[f"{MEAN_OF_SQUARES}, {passing}"] = _of_squares(cv, n, fit)
    return found


def _of_mean(cv: Array, n: Array, kept: NDArray[np.intp] | None = None) -> Version:
    chosen = np.arange(len(cv)) if kept is None else kept
    top = largest_share(n[chosen] * cv[chosen])
    average = square_of_mean(cv[chosen], n[chosen])
    return Version(average, Share(int(chosen[top.index]), top.share), len(chosen))


def _of_squares(cv: Array, n: Array, kept: NDArray[np.intp] | None = None) -> Version:
    chosen = np.arange(len(cv)) if kept is None else kept
    top = largest_share(n[chosen] * cv[chosen] ** 2)
    average = mean_of_squares(cv[chosen], n[chosen])
    return Version(average, Share(int(chosen[top.index]), top.share), len(chosen))
