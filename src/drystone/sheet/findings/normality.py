"""Arms whose log mean is far from normal."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, where
from drystone.sheet.notes import Note
from drystone.words import arms, levels

ENOUGH = 3.0  # formulas: Hedges et al. 1999; small-sample form Lajeunesse 2015


def doubtful_normality(draft: Draft) -> Iterator[Note]:
    """Arms with 4 n^1.5 / (1 + 4 n) x mean / SD below 3."""
    for arm in arms.ARMS:
        mean, n, sd = draft.number(f"{arm}_mean"), draft.number(f"{arm}_n"), draft.sds[arm]
        known = (mean > 0) & (n >= 1) & (sd > 0)
        index = np.full(draft.size, np.inf)
        with np.errstate(over="ignore", invalid="ignore"):
            at = n[known]
            index[known] = (mean[known] / sd[known]) * (4 * at**1.5 / (1 + 4 * at))
        yield from draft.notes(
            levels.WARN,
            "normal approximation",
            f"{arm}_mean",
            where(index < ENOUGH),
            lambda row, index=index, arm=arm: (  # type: ignore[misc]
                f"the {arm} mean is small against its spread (index {index[row]:.2f}, below 3), "
                "so the variance of its logarithm is doubtful"
            ),
            "check mean, spread and its kind; see what leaving such rows out changes",
        )
