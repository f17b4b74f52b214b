"""Effects: reads the slice -> writes the log response ratio of each row from its own numbers."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd

from drystone.maths import log_ratio
from drystone.maths.average_variation import GEARY_LIMIT
from drystone.tables.effects import EFFECTS
from drystone.tables.store import read_table, write_table
from drystone.words.arms import ARMS


def run(source: Path, target: Path) -> None:
    """Write first and second order side by side, with the diagnostics of each arm."""
    write_table(effects_table(read_table(source)), target, EFFECTS)


def effects_table(rows: pd.DataFrame) -> pd.DataFrame:
    """Effects of ``rows`` (a slice); effects of outcomes with flip_sign are turned."""
    table = rows[["row_id", "study"]].copy()
    for arm in ARMS:
        mean, sd, n = (rows[f"{arm}_{part}"].to_numpy(float) for part in ("mean", "sd", "n"))
        table[f"{arm}_cv"] = sd / mean
        table[f"{arm}_theta"] = log_ratio.theta((sd / mean) ** 2, n)
        table[f"{arm}_geary"] = log_ratio.small_sample_geary(mean, sd, n)
    theta_t, theta_c = table["treatment_theta"].to_numpy(), table["control_theta"].to_numpy()
    means = rows["treatment_mean"].to_numpy(float), rows["control_mean"].to_numpy(float)
    sign = np.where(rows["flip"], -1.0, 1.0)
    first = log_ratio.first_order(*means, theta_t, theta_c)
    second = log_ratio.second_order(*means, theta_t, theta_c)
    table["effect_first"], table["variance_first"] = sign * first.y, first.v
    table["effect_second"], table["variance_second"] = sign * second.y, second.v
    share = log_ratio.second_order_share(theta_t, theta_c)
    table["second_order_share"] = np.where(np.isnan(second.v), np.nan, share)
    table["normal_enough"] = normal_enough(table)
    return table


def normal_enough(table: pd.DataFrame) -> np.ndarray:
    """'pass' when both arms reach a Geary value of 3, 'unknown' when an SD lacks, else 'fail'."""
    values = table[[f"{arm}_geary" for arm in ARMS]].to_numpy(float)
    fails = (values < GEARY_LIMIT).any(axis=1)
    unknown = np.isnan(values).any(axis=1)
    return np.select([fails, unknown], ["fail", "unknown"], "pass")
