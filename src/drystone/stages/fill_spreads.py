"""Spreads: reads the slice -> writes what one strategy uses: effects, variances, covariances.

Also writes the averages that were plugged in and the ledger of the rows that the strategy drops.
"""

from __future__ import annotations

from importlib import import_module
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from drystone.maths import log_ratio
from drystone.maths.sampling_covariance import shared_arm_covariance
from drystone.stages.ledger import ledger_rows
from drystone.stages.strategies import REGISTRY
from drystone.stages.strategies.filled import Filled, NothingReported, no_averages
from drystone.tables.check import LEDGER
from drystone.tables.effects import AVERAGES, COVARIANCE, SAMPLING
from drystone.tables.store import empty_table, read_table, write_table
from drystone.words.arms import ARMS
from drystone.words.scales import SECOND

if TYPE_CHECKING:
    from drystone.settings.model import Analysis, Strategy


def run(source: Path, analysis: Analysis, strategy: Strategy, target: Path) -> None:
    """Write sampling, covariance, averages and ledger to the folder ``target``."""
    filled = _fill(read_table(source), strategy)
    write_table(sampling_table(filled.rows, analysis), target / "sampling.parquet", SAMPLING)
    pairs = covariance_table(filled.rows, analysis)
    write_table(pairs, target / "covariance.parquet", COVARIANCE)
    write_table(filled.averages, target / "averages.parquet", AVERAGES)
    write_table(filled.ledger, target / "ledger.parquet", LEDGER)


def sampling_table(rows: pd.DataFrame, analysis: Analysis) -> pd.DataFrame:
    """Effect and sampling variance of each row, from the squared CVs that the strategy chose."""
    if rows.empty:
        return empty_table(SAMPLING)
    theta = _thetas(rows)
    means = rows["treatment_mean"].to_numpy(float), rows["control_mean"].to_numpy(float)
    compute = log_ratio.second_order if analysis.order == SECOND else log_ratio.first_order
    found = compute(*means, theta["treatment"], theta["control"])
    names = ["row_id", "study"]
    for arm in ARMS:
        names += [f"{arm}_cv2", f"{arm}_cv_source"]
    table = rows[names].copy()
    table["effect"] = np.where(rows["flip"], -1.0, 1.0) * found.y
    table["sampling_variance"] = found.v
    return table


def covariance_table(rows: pd.DataFrame, analysis: Analysis) -> pd.DataFrame:
    """Sampling covariance of every pair of rows that share an arm."""
    if rows.empty or analysis.shared_controls == "ignore":
        return empty_table(COVARIANCE)
    codes, _ = pd.factorize(pd.concat([rows["treatment_arm"], rows["control_arm"]]))
    treatment, control = codes[: len(rows)], codes[len(rows) :]
    variances = {
        arm: log_ratio.log_mean_variance(theta, analysis.order)
        for arm, theta in _thetas(rows).items()
    }
    pairs = shared_arm_covariance(treatment, control, variances["treatment"], variances["control"])
    sign = np.where(rows["flip"], -1.0, 1.0)
    ids = rows["row_id"].to_numpy()
    return pd.DataFrame(
        {
            "row_id": ids[pairs.i],
            "other_row_id": ids[pairs.j],
            "covariance": sign[pairs.i] * sign[pairs.j] * pairs.covariance,
        }
    )


def _fill(rows: pd.DataFrame, strategy: Strategy) -> Filled:
    module = import_module(REGISTRY[strategy.use])
    try:
        filled: Filled = module.fill(rows, strategy)
    except NothingReported as error:
        return Filled(rows.iloc[:0], ledger_rows(rows, "no spread", str(error)), no_averages())
    return filled


def _thetas(rows: pd.DataFrame) -> dict[str, np.ndarray]:
    return {
        arm: log_ratio.theta(rows[f"{arm}_cv2"].to_numpy(float), rows[f"{arm}_n"].to_numpy(float))
        for arm in ARMS
    }
