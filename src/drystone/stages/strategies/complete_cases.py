"""Complete cases: only rows whose two arms report an SD, each with its own."""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd

from drystone.stages.strategies.filled import Filled, no_averages, only_complete, own_cv2
from drystone.words.arms import ARMS

if TYPE_CHECKING:
    from drystone.settings.model import Strategy


def fill(rows: pd.DataFrame, strategy: Strategy) -> Filled:
    """Drop the rows without both SDs; nothing is plugged in."""
    kept, left = only_complete(rows)
    for arm in ARMS:
        kept[f"{arm}_cv2"] = own_cv2(kept, arm)
        kept[f"{arm}_cv_source"] = "own"
    return Filled(kept, left, no_averages())
