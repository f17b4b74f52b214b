"""Missing cases: own SDs where reported, the average CV where not.

References
----------
Nakagawa et al. (2023) Ecol Lett 26:232-244, doi 10.1111/ele.14144.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd

from drystone.stages.strategies.averages import average_cv
from drystone.stages.strategies.filled import Filled, no_ledger, only_complete, with_cv2

if TYPE_CHECKING:
    from drystone.settings.model import Strategy


def fill(rows: pd.DataFrame, strategy: Strategy) -> Filled:
    """Plug the average squared CV into the arms that report no SD.

    Raises
    ------
    NothingReported
        When no arm of the slice reports an SD.
    """
    averages = average_cv(rows, strategy)
    kept, left = only_complete(rows) if strategy.rows == "complete" else (rows, no_ledger())
    return Filled(with_cv2(kept, averages.by_row(kept), average=False), left, averages.table)
