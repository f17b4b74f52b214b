"""One arm out of several subgroups, as if their values had been listed together.

References
----------
Cochrane Handbook for Systematic Reviews of Interventions, version 6, section 6.5.2.10 (combining
groups), Table 6.5.a; here for any number of groups.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import numpy.typing as npt

from drystone.maths.spread_recovery.arrays import floats


@dataclass(frozen=True)
class Combined:
    """Replicates, mean and SD of the groups together."""

    n: float
    mean: float
    sd: float


def combine_groups(n: npt.ArrayLike, mean: npt.ArrayLike, sd: npt.ArrayLike) -> Combined:
    """Combine groups exactly.

    Parameters
    ----------
    n, mean, sd : (g,) float, one entry for each group; n >= 1, sd >= 0 (whatever stands for the SD
        of a group of one value is not used)

    Returns
    -------
    Combined
        ``SD^2 = [sum (n - 1) s^2 + sum n (m - M)^2] / (N - 1)``, N and M the total and the weighted
        mean; NaN when a number is missing, and SD NaN for N = 1

    Raises
    ------
    ValueError
        When the arrays are empty, differ in length, or hold an n below one or a negative SD.

    Notes
    -----
    Right for subgroups of one arm (sites, sexes). Combining doses changes the question.
    """
    n, mean, sd = floats(n), floats(mean), floats(sd)
    if n.ndim != 1 or not n.size or not n.shape == mean.shape == sd.shape:
        raise ValueError("combine at least one group, each with its n, mean and SD")
    if (n < 1).any() or (sd < 0).any():
        raise ValueError("a group has an n below one, or a negative SD")
    total = n.sum()
    together = (n / total) @ mean
    within = np.where(n > 1, (n - 1.0) * sd**2, 0.0).sum()
    between = (n * (mean - together) ** 2).sum()
    variance = (within + between) / (total - 1.0) if total > 1 else np.nan
    return Combined(float(total), float(together), float(np.sqrt(variance)))
