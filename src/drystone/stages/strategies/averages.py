"""Average CV by arm and outcome, over the physical arms that report an SD.

An average of one outcome and arm with fewer than ten reporting arms is pooled over the outcomes of
the analysis, and the table says so. Arms stay apart: pooling them loses what the strategy is for.
SDs that are one value for both arms stay out of averages by arm; where they are the majority the
average is over both arms. A physical arm that is the control of some rows and the treatment of
others has one role here, that of more rows, so that it has one CV in every row.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from drystone.maths import average_variation as variation
from drystone.stages.strategies.filled import (
    Filled,
    NothingReported,
    no_ledger,
    only_complete,
    with_cv2,
)
from drystone.tables.effects import AVERAGES
from drystone.tables.store import conform
from drystone.words import strategies
from drystone.words.arms import ARMS, CONTROL, TREATMENT

if TYPE_CHECKING:
    from drystone.settings.model import Strategy

BOTH = "both"
ALL_OUTCOMES = "all outcomes"


@dataclass(frozen=True)
class Averages:
    """Squared CV for each (outcome, arm), and the table that shows all versions."""

    values: dict[tuple[str, str], float]
    table: pd.DataFrame
    roles: dict[str, str]

    def by_row(self, rows: pd.DataFrame) -> dict[str, np.ndarray]:
        """Plugged-in squared CV of each arm, (k,) each; equal wherever the physical arm is."""
        found = {}
        for side in ARMS:
            pairs = zip(rows["outcome"], rows[f"{side}_arm"], strict=True)
            values = [self.values[outcome, self.roles[arm]] for outcome, arm in pairs]
            found[side] = np.array(values, dtype=float)
        return found


def average_cv(rows: pd.DataFrame, strategy: Strategy) -> Averages:
    """Average squared CV of every arm and outcome in ``rows``.

    Raises
    ------
    NothingReported
        When no arm reports an SD above zero.
    """
    arms = reporting_arms(rows)
    if arms.empty:
        raise NothingReported("no arm of this analysis reports an SD, so there is no average CV")
    together = strategy.average_over == strategies.BOTH_ARMS or _pooled_majority(arms)
    if not together:
        arms = arms[~arms["pooled"]]
    values: dict[tuple[str, str], float] = {}
    shown: dict[tuple[str, str], pd.DataFrame] = {}
    for outcome in sorted(rows["outcome"].unique()):
        for arm in ARMS:
            chosen = _choose(arms, outcome, BOTH if together else arm)
            key = (chosen.outcome, chosen.arm)
            if key not in shown:
                shown[key] = _versions(chosen, strategy.average_cv)
            used = shown[key].loc[shown[key]["used"], "cv2"]
            values[outcome, arm] = float(used.iloc[0])
    table = conform(pd.concat(shown.values(), ignore_index=True), AVERAGES)
    return Averages(values, table, arm_roles(rows))


def plug_in(rows: pd.DataFrame, strategy: Strategy, everywhere: bool) -> Filled:
    """Rows with the average squared CV where an arm reports no SD, or everywhere.

    Raises
    ------
    NothingReported
        When no arm of the slice reports an SD.
    """
    averages = average_cv(rows, strategy)
    few = strategy.rows == strategies.COMPLETE_ROWS
    kept, left = only_complete(rows) if few else (rows, no_ledger())
    return Filled(with_cv2(kept, averages.by_row(kept), everywhere), left, averages.table)


def arm_roles(rows: pd.DataFrame) -> dict[str, str]:
    """Role of every physical arm: that in which it stands in more rows, control when equal."""
    counts = {role: rows[f"{role}_arm"].value_counts() for role in ARMS}
    treatment = counts[TREATMENT]
    control = counts[CONTROL].reindex(treatment.index, fill_value=0)
    roles = dict.fromkeys(rows[f"{CONTROL}_arm"], CONTROL)
    return roles | {str(arm): TREATMENT for arm in treatment.index[treatment > control]}


def reporting_arms(rows: pd.DataFrame) -> pd.DataFrame:
    """Physical arms with an SD, each once, in its role: outcome, role, arm, cv, n, pooled."""
    parts = [
        pd.DataFrame(
            {
                "outcome": rows["outcome"],
                "role": role,
                "arm": rows[f"{role}_arm"],
                "cv": rows[f"{role}_sd"] / rows[f"{role}_mean"],
                "n": rows[f"{role}_n"],
                "pooled": rows[f"{role}_sd_pooled"],
            }
        )
        for role in ARMS
    ]
    arms = pd.concat(parts, ignore_index=True)
    arms = arms[arms["cv"].notna() & (arms["cv"] > 0)]
    arms["role"] = arms["arm"].map(arm_roles(rows))
    return arms.drop_duplicates("arm").sort_values(["role", "arm"], ignore_index=True)


@dataclass(frozen=True)
class _Chosen:
    outcome: str
    arm: str
    arms: pd.DataFrame
    because: str


def _choose(arms: pd.DataFrame, outcome: str, arm: str) -> _Chosen:
    """Reporting arms for one average: its own, or pooled upward when they are too few."""
    of_arm = arms if arm == BOTH else arms[arms["role"] == arm]
    own = of_arm[of_arm["outcome"] == outcome]
    enough = len(own) >= variation.FEWEST_ARMS
    if enough or (len(own) and of_arm["outcome"].nunique() == 1):
        few = "" if enough else f"only {len(own)} arms report, and there is nothing to pool with"
        return _Chosen(outcome, arm, own, few)
    few = f"only {len(own)} arms of {outcome} report"
    if len(of_arm):
        return _Chosen(ALL_OUTCOMES, arm, of_arm, few)
    return _Chosen(ALL_OUTCOMES, BOTH, arms, f"no {arm} arm reports")


def _pooled_majority(arms: pd.DataFrame) -> bool:
    return bool(arms["pooled"].mean() > 0.5)


def _versions(chosen: _Chosen, used: str) -> pd.DataFrame:
    cv, n = chosen.arms["cv"].to_numpy(float), chosen.arms["n"].to_numpy(float)
    names = chosen.arms["arm"].to_numpy()
    rows = [
        {
            "outcome": chosen.outcome,
            "arm": chosen.arm,
            "version": name,
            "cv2": version.cv2,
            "reporting_arms": version.arms,
            "used": name == used,
            "pooled_because": chosen.because or None,
            "largest_share": version.top.share if version.top else np.nan,
            "largest_arm": names[version.top.index] if version.top else None,
        }
        for name, version in variation.all_versions(cv, n).items()
    ]
    return pd.DataFrame(rows)
