"""One number for each study, so that a page of 600 rows can be read at the level of studies.

The summary of a study is the generalised least squares mean of its rows under the sampling
covariance of the strategy plus the fitted variance between rows: what the study says by itself,
without borrowing from the others. (Aitken 1935, Proc R Soc Edinb 55:42, for the estimator.)
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

ROUNDING = 1e-10  # of the largest eigenvalue: smaller negative ones are zeros that were rounded


@dataclass(frozen=True)
class StudySummary:
    """Mean effect of one study's rows on the log scale and its standard error.

    Both are NaN where the rows' covariance is one that no set of rows could have.
    """

    study: str
    rows: int
    mean: float
    se: float


def summarise_studies(
    sampling: pd.DataFrame, covariance: pd.DataFrame, between_rows: float
) -> list[StudySummary]:
    """Summary of each study, in order of first appearance.

    Parameters
    ----------
    sampling : tables.effects.SAMPLING
    covariance : tables.effects.COVARIANCE, pairs of rows that share an arm (either order)
    between_rows : variance between rows of a study, 0 when there is no such component
    """
    pairs = _pairs(covariance)
    return [
        _summary(str(study), rows, pairs, between_rows)
        for study, rows in sampling.groupby("study", sort=False)
    ]


def _pairs(covariance: pd.DataFrame) -> dict[str, list[tuple[str, float]]]:
    pairs: dict[str, list[tuple[str, float]]] = {}
    columns = (covariance[name] for name in ("row_id", "other_row_id", "covariance"))
    for row, other, value in zip(*columns, strict=True):
        if row != other:
            pairs.setdefault(row, []).append((other, float(value)))
            pairs.setdefault(other, []).append((row, float(value)))
    return pairs


def _summary(
    study: str, rows: pd.DataFrame, pairs: dict[str, list[tuple[str, float]]], between_rows: float
) -> StudySummary:
    effects = rows["effect"].to_numpy(dtype=float)
    spread = _spread(rows, pairs, between_rows)
    if not _possible(spread):
        return StudySummary(study, len(rows), math.nan, math.nan)
    # Rows that share both arms in number (or an arm of SD zero) make the matrix singular; the
    # pseudo-inverse then gives them one row's weight together, which is what they say together.
    weights = np.linalg.pinv(spread, hermitian=True) @ np.ones(len(effects))
    total = float(weights.sum())
    if not total > 0:
        return StudySummary(study, len(rows), math.nan, math.nan)
    return StudySummary(study, len(rows), float(weights @ effects) / total, total**-0.5)


def _spread(
    rows: pd.DataFrame, pairs: dict[str, list[tuple[str, float]]], between_rows: float
) -> NDArray[np.float64]:
    spread = np.diag(rows["sampling_variance"].to_numpy(dtype=float) + between_rows)
    position = {row: i for i, row in enumerate(rows["row_id"])}
    for row, i in position.items():
        for other, value in pairs.get(row, []):
            if other in position:
                spread[i, position[other]] = value
    return spread


def _possible(spread: NDArray[np.float64]) -> bool:
    """Whether a covariance has no negative direction, rounding apart."""
    if not np.isfinite(spread).all():
        return False
    values = np.linalg.eigvalsh(spread)
    return bool(values[0] >= -ROUNDING * max(values[-1], 0.0))
