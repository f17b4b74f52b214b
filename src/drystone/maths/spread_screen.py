"""Whether an SD looks like those of its outcome, or like a standard error.

Symbols: s printed SD; m mean; n replicates; c = ln(s / m). Among the arms of an outcome ln CV is
taken as normal around ``location`` with SD ``scale`` (one study in ten three times as far), and
(n - 1) s^2 / sigma^2 of an arm as chi-squared with n - 1 degrees of freedom. So an arm with few
replicates may lie far out by chance alone. Robust location and scale, the shares between and
within studies, the share of wide ones and all limits: common practice, no source.

References
----------
The chi-squared law of a normal sample's variance is in every textbook; mean and variance of its
logarithm are digamma and trigamma: Bartlett and Kendall 1946, J R Stat Soc Suppl 8:128 (memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt
from scipy import special

Floats = npt.NDArray[np.float64]
Ints = npt.NDArray[np.intp]

NORMAL_QUARTILE = 0.6744897501960817  # of |z|: its median when z is standard normal
LEAST_SCALE = 0.2  # CVs of one outcome seldom agree better than by a factor of 1.2
WIDE_SHARE, WIDE = 0.1, 3.0
MANY_GROUPS = 60  # from here on, leaving one group out moves a median by next to nothing
_NODES, _WEIGHTS = np.polynomial.hermite_e.hermegauss(61)
_WEIGHTS = _WEIGHTS / np.sqrt(2.0 * np.pi)


@dataclass(frozen=True)
class Reference:
    """What the other studies of an outcome look like, an entry for every value.

    Parameters
    ----------
    location : (k,) float, robust middle of the others
    scale : (k,) float, robust SD of the others, sampling error apart; NaN when they are too few
    """

    location: Floats
    scale: Floats


def reference(
    values: Floats, noise: Floats, groups: Ints, least_scale: float = LEAST_SCALE, fewest: int = 10
) -> Reference:
    """Robust middle and scale of all values outside each value's own group.

    The middle is the median of the groups' medians, so that a large study counts once. The scale
    solves median(|x - middle| / sqrt(scale^2 + noise)) = 0.6745. With fewer than five other groups
    the other single values stand in for them.

    Parameters
    ----------
    values : (k,) float, finite
    noise : (k,) float, >= 0, sampling variance of each value
    groups : (k,) int, study of each value
    least_scale : no scale is smaller
    fewest : other values that are needed
    """
    location, scale = np.full(values.size, np.nan), np.full(values.size, np.nan)
    several = np.unique(groups).size > 5
    units = groups if several else np.arange(values.size)
    if np.unique(units).size > MANY_GROUPS:
        found = _middle_and_scale(values, noise, groups, several, least_scale)
        return Reference(np.full(values.size, found[0]), np.full(values.size, found[1]))
    for unit in np.unique(units):
        own = units == unit
        if (~own).sum() >= fewest:
            location[own], scale[own] = _middle_and_scale(
                values[~own], noise[~own], groups[~own], several, least_scale
            )
    return Reference(location, scale)


def log_sd_bias(n: npt.ArrayLike) -> Floats:
    """Mean of ln(s / sigma) in normal samples, (digamma((n-1)/2) - ln((n-1)/2)) / 2.

    Parameters
    ----------
    n : (k,) float, > 1
    """
    half = (np.asarray(n, dtype=np.float64) - 1.0) / 2.0
    return np.asarray(0.5 * (special.digamma(half) - np.log(half)))


def log_sd_variance(n: npt.ArrayLike) -> Floats:
    """Variance of ln s in normal samples, trigamma((n - 1) / 2) / 4.

    Parameters
    ----------
    n : (k,) float, > 1
    """
    half = (np.asarray(n, dtype=np.float64) - 1.0) / 2.0
    return np.asarray(special.polygamma(1, half) / 4.0)


def log_density(log_cv: Floats, n: Floats, location: Floats, scale: Floats, block: Ints) -> Floats:
    """Log density of the ln CVs of each block of arms, as of the arms of one study.

    Half of the variance scale^2 lies between blocks and half between the arms of a block, so ten
    arms of a study are far less than ten studies. Arms take up their half by fewer degrees of
    freedom, which keeps the shape of the chi-squared law and its long lower tail.

    Parameters
    ----------
    log_cv : (k,) float, ln(s / m) of each arm
    n : (k,) float, > 1
    location, scale : (k,) float, of the outcome's ln CV
    block : (k,) int, sorted, counted from 0 without gaps

    Returns
    -------
    (b,) float, one for each block
    """
    half = scale / np.sqrt(2.0)
    noise, back = np.unique(log_sd_variance(n) + half**2, return_inverse=True)
    df = 2.0 * _inverse_trigamma(4.0 * noise)[back]
    away = log_cv - log_sd_bias(n) + log_sd_bias(df + 1.0) - location
    starts = np.searchsorted(block, np.arange(block[-1] + 1))
    parts = []
    for share, width in ((1.0 - WIDE_SHARE, 1.0), (WIDE_SHARE, WIDE)):
        inner = _log_chi(away[:, None] - width * half[:, None] * _NODES, df[:, None])
        total = np.add.reduceat(inner, starts, axis=0) + np.log(share * _WEIGHTS)
        parts.append(special.logsumexp(total, axis=1))
    return np.asarray(np.logaddexp(*parts))


def log_ratio_se(log_cv: Floats, n: Floats, location: Floats, scale: Floats, block: Ints) -> Floats:
    """Log likelihood ratio of "these SDs are standard errors" against "they are SDs".

    A standard error times sqrt(n) has the law of an SD; the logarithm only shifts, so no Jacobian
    is needed.

    Parameters
    ----------
    log_cv, n, location, scale, block : as in `log_density`

    Returns
    -------
    (b,) float, one for each block
    """
    there = log_density(log_cv + 0.5 * np.log(n), n, location, scale, block)
    return there - log_density(log_cv, n, location, scale, block)


def log_ratio_sd(log_cv: Floats, n: Floats, location: Floats, scale: Floats, block: Ints) -> Floats:
    """Log likelihood ratio of "the standard errors typed here were SDs already".

    Parameters
    ----------
    log_cv : (k,) float, ln CV of the SDs that were computed as standard error times sqrt(n)
    n, location, scale, block : as in `log_density`

    Returns
    -------
    (b,) float, one for each block
    """
    there = log_density(log_cv - 0.5 * np.log(n), n, location, scale, block)
    return there - log_density(log_cv, n, location, scale, block)


def too_small(log_cv: Floats, n: Floats, location: Floats, scale: Floats, sds: float) -> Floats:
    """Chance of so small an s when the true CV lies ``sds`` scales below the outcome's middle.

    Parameters
    ----------
    log_cv, n, location, scale : (k,) float
    sds : how far below
    """
    return np.asarray(special.gammainc((n - 1.0) / 2.0, _chi(log_cv, n, location - sds * scale)))


def too_large(log_cv: Floats, n: Floats, location: Floats, scale: Floats, sds: float) -> Floats:
    """Chance of so large an s when the true CV lies ``sds`` scales above the outcome's middle.

    Parameters
    ----------
    log_cv, n, location, scale : (k,) float
    sds : how far above
    """
    return np.asarray(special.gammaincc((n - 1.0) / 2.0, _chi(log_cv, n, location + sds * scale)))


def _chi(log_cv: Floats, n: Floats, log_sigma: Floats) -> Floats:
    """Half the chi-squared of s against sigma."""
    with np.errstate(over="ignore"):
        return np.asarray(0.5 * (n - 1.0) * np.exp(np.clip(2 * (log_cv - log_sigma), -700, 700)))


def _log_chi(distance: Floats, df: Floats) -> Floats:
    """Log density of ln s at ``distance`` from ln sigma."""
    half = df / 2.0
    power = np.exp(np.clip(2.0 * distance, -700.0, 700.0))
    constant = half * np.log(half) - special.gammaln(half) + np.log(2.0)
    return np.asarray(constant + df * distance - half * power)


def _inverse_trigamma(value: Floats) -> Floats:
    """Where trigamma takes ``value`` > 0; Newton's method on its reciprocal, which is convex."""
    at = 0.5 + 1.0 / value
    for _ in range(8):
        found = special.polygamma(1, at)
        at = at + found * (1.0 - found / value) / special.polygamma(2, at)
    return np.asarray(at)


def _middle_and_scale(
    values: Floats, noise: Floats, groups: Ints, by_group: bool, least: float
) -> tuple[float, float]:
    middle = float(np.median(_medians(values, groups) if by_group else values))
    apart = np.abs(values - middle)
    low, high = 0.0, float(np.max(apart)) / NORMAL_QUARTILE + least
    for _ in range(40):
        scale = 0.5 * (low + high)
        with np.errstate(divide="ignore", invalid="ignore"):
            spread = float(np.median(np.where(apart > 0, apart / np.sqrt(scale**2 + noise), 0.0)))
        low, high = (scale, high) if spread > NORMAL_QUARTILE else (low, scale)
    return middle, max(0.5 * (low + high), least)


def _medians(values: Floats, groups: Ints) -> Floats:
    order = np.argsort(groups, kind="stable")
    cuts = np.flatnonzero(np.diff(groups[order])) + 1
    return np.array([np.median(part) for part in np.split(values[order], cuts)])
