"""Missing cases: own SDs where reported, the average CV where not.

References
----------
Nakagawa et al. (2023) Ecol Lett 26:232-244, doi 10.1111/ele.14144.
"""

from __future__ import annotations

from typing import TYPE_CHECKING

import pandas as pd

from drystone.stages.strategies.averages import plug_in
from drystone.stages.strategies.filled import Filled

if TYPE_CHECKING:
    from drystone.settings.model import Strategy


def fill(rows: pd.DataFrame, strategy: Strategy) -> Filled:
    """Plug the average squared CV into the arms that report no SD.

    Raises
    ------
    NothingReported
        When no arm of the slice reports an SD.
    """
    return plug_in(rows, strategy, everywhere=False)
