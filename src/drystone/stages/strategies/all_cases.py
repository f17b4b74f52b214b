"""All cases: the average CV in every row, reported or not.

References
----------
Nakagawa et al. (2023) Ecol Lett 26:232-244, doi 10.1111/ele.14144; Doncaster & Spake (2018)
Methods Ecol Evol 9:634-644.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd

from drystone.stages.strategies.averages import average_cv
from drystone.stages.strategies.filled import Filled, no_ledger, only_complete, with_cv2

if TYPE_CHECKING:
    from drystone.settings.model import Strategy


def fill(rows: pd.DataFrame, strategy: Strategy) -> Filled:
    """Plug the average squared CV into every arm.

    Raises
    ------
    NothingReported
        When no arm of the slice reports an SD.
    """
    averages = average_cv(rows, strategy)
    kept, left = only_complete(rows) if strategy.rows == "complete" else (rows, no_ledger())
    return Filled(with_cv2(kept, averages.by_row(kept), average=True), left, averages.table)
