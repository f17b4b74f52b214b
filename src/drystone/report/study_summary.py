"""One number for each study, so that a page of 600 rows can be read at the level of studies.

The summary of a study is the generalised least squares mean of its rows under the sampling
covariance of the strategy plus the fitted variance between rows: what the study says by itself,
without borrowing from the others. (Aitken 1935, Proc R Soc Edinb 55:42, for the estimator.)
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd


@dataclass(frozen=True)
class StudySummary:
    """Mean effect of one study's rows on the log scale and its standard error."""

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
    spread = np.diag(rows["sampling_variance"].to_numpy(dtype=float) + between_rows)
    position = {row: i for i, row in enumerate(rows["row_id"])}
    for row, i in position.items():
        for other, value in pairs.get(row, []):
            if other in position:
                spread[i, position[other]] = value
    # Rows that share both arms in number (or an arm of SD zero) make the matrix singular; the
    # pseudo-inverse then gives them one row's weight together, which is what they say together.
    weights = np.linalg.pinv(spread, hermitian=True) @ np.ones(len(effects))
    total = float(weights.sum())
    return StudySummary(study, len(rows), float(weights @ effects) / total, total**-0.5)
