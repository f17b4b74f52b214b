"""Side by side: reads all fits of one analysis -> writes one table of strategies and models."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from drystone.tables.results import SIDE_BY_SIDE
from drystone.tables.store import read_table, write_table
from drystone.words.strategies import COMPLETE_CASES, COMPLETE_ROWS

if TYPE_CHECKING:
    from drystone.settings.model import Strategy

ALL_USABLE = "all usable rows"
BOTH_SDS = "rows with both SDs"


def run(
    fits: dict[tuple[str, str], Path], strategies: dict[str, Strategy], primary: str, target: Path
) -> None:
    """Write one row per strategy, model and coefficient.

    Parameters
    ----------
    fits : coefficients file of every (strategy, model)
    """
    parts = []
    for (name, model), path in fits.items():
        table = read_table(path)
        strategy = strategies[name]
        few = strategy.use == COMPLETE_CASES or strategy.rows == COMPLETE_ROWS
        table["strategy"], table["model"] = name, model
        table["row_set"] = BOTH_SDS if few else ALL_USABLE
        table["primary"] = name == primary
        parts.append(table)
    joined = pd.concat(parts, ignore_index=True)
    joined["sign"] = np.select(
        [joined["estimate"] > 0, joined["estimate"] < 0, joined["estimate"] == 0],
        ["positive", "negative", "none"],
        "",
    )
    outside = (joined["ci_low"] > 0) | (joined["ci_high"] < 0)
    joined["excludes_zero"] = np.where(
        joined["refused"].notna(), "", np.where(outside, "yes", "no")
    )
    write_table(joined, target, SIDE_BY_SIDE)
