"""Log response ratio of two positive means, first and second order.

Symbols: t treatment, c control; theta = CV^2 / n of one arm (a = theta_t, b = theta_c in the
papers); y effect; v sampling variance. All arrays are (k,) and float64.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]


@dataclass(frozen=True)
class Effects:
    """Effects ``y`` (k,) and their sampling variances ``v`` (k,), on the natural log scale."""

    y: Array
    v: Array


def theta(cv2: Array, n: Array) -> Array:
    """First-order sampling variance of a log mean: squared coefficient of variation over n."""
    found: Array = np.asarray(cv2, dtype=float) / np.asarray(n, dtype=float)
    return found


def log_ratio(mean_t: Array, mean_c: Array) -> Array:
    """Natural log of the ratio of two positive means (k,); blank where a mean is not positive."""
    t, c = np.asarray(mean_t, dtype=float), np.asarray(mean_c, dtype=float)
    usable = (t > 0) & (c > 0)
    return np.log(np.where(usable, t, np.nan)) - np.log(np.where(usable, c, np.nan))


def first_order(mean_t: Array, mean_c: Array, theta_t: Array, theta_c: Array) -> Effects:
    """Log response ratio with its delta-method variance.

    Parameters
    ----------
    mean_t, mean_c : (k,) positive means in one unit
    theta_t, theta_c : (k,) CV^2 / n of each arm

    Returns
    -------
    Effects
        ``y = ln(mean_t / mean_c)``, ``v = theta_t + theta_c``.

    Notes
    -----
    Poor where ``mean sqrt(n) / sd`` is below about 3.

    References
    ----------
    Hedges, Gurevitch & Curtis (1999) Ecology 80:1150-1156.
    """
    return Effects(log_ratio(mean_t, mean_c), theta_t + theta_c)


def second_order(mean_t: Array, mean_c: Array, theta_t: Array, theta_c: Array) -> Effects:
    """Log response ratio corrected for small-sample bias, with the second-order variance.

    Parameters
    ----------
    mean_t, mean_c : (k,) positive means in one unit
    theta_t, theta_c : (k,) CV^2 / n of each arm

    Returns
    -------
    Effects
        ``y = ln(mean_t / mean_c) + (theta_t - theta_c) / 2``,
        ``v = theta_t + theta_c + (theta_t^2 + theta_c^2) / 2``.

    Notes
    -----
    The published variance keeps theta^2 / 2 of each arm; the full expansion of Var(ln mean) to
    that order has 5/2 theta^2. With the arms' own SDs it explodes where a mean is near zero.

    References
    ----------
    Lajeunesse (2015) Ecology 96:2056-2063, doi 10.1890/14-2402.1.
    """
    y = log_ratio(mean_t, mean_c) + (theta_t - theta_c) / 2
    return Effects(y, log_mean_variance(theta_t) + log_mean_variance(theta_c))


def log_mean_variance(theta_arm: Array, order: str = "second") -> Array:
    """Sampling variance that one arm brings to a log ratio: theta, or theta + theta^2 / 2.

    References
    ----------
    Lajeunesse (2011) Ecology 92:2049-2055 (shared control: this is also the covariance).
    """
    return theta_arm if order == "first" else theta_arm + theta_arm**2 / 2


def second_order_share(theta_t: Array, theta_c: Array) -> Array:
    """Part of the second-order variance that first order does not have, between 0 and 1."""
    extra = (theta_t**2 + theta_c**2) / 2
    total = theta_t + theta_c + extra
    return np.divide(extra, total, out=np.zeros_like(total), where=total > 0)


def small_sample_geary(mean: Array, sd: Array, n: Array) -> Array:
    """Standardised mean (k,) whose value of 3 or more supports the normal approximation.

    Returns
    -------
    (k,)
        ``4 n^(3/2) / (1 + 4 n) * mean / sd``; blank without an SD, infinite where the SD is zero.

    References
    ----------
    Geary (1930) J R Stat Soc 93:442-446; Lajeunesse (2015) Ecology 96:2056-2063.
    """
    ratio = np.full(np.shape(mean), np.inf)
    np.divide(mean, sd, out=ratio, where=np.asarray(sd) != 0)
    ratio = np.where(np.isnan(sd), np.nan, ratio)
    return ratio * 4 * n**1.5 / (1 + 4 * n)


def percent_change(y: Array) -> Array:
    """Percent change of the median ratio, ``100 (exp(y) - 1)``."""
    return 100 * np.expm1(y)
