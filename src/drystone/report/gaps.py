"""Which arms report no SD: by study and by outcome, each physical arm counted once."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from drystone.report import numbers
from drystone.report.facts import Record, records
from drystone.report.ladder import year_beside
from drystone.words import arms

STATE_WORDS = {
    "own": "own SD",
    "other row": "SD read from another row of the same arm",
    "none": "no SD",
}


@dataclass(frozen=True)
class GapCell:
    """One comparison: whose SD each arm has."""

    row_id: str
    anchor: str
    control: str
    treatment: str
    title: str


@dataclass(frozen=True)
class GapStudy:
    """One study with its comparisons."""

    name: str
    year: str
    cells: tuple[GapCell, ...]
    missing: int
    arms: int


@dataclass(frozen=True)
class GapCount:
    """Physical arms of one outcome and side, with and without an SD."""

    outcome: str
    arm: str
    arms: int
    missing: int
    pooled: int


def gap_studies(
    rows: pd.DataFrame, studies: pd.DataFrame, anchors: dict[str, str]
) -> tuple[GapStudy, ...]:
    """Studies in order of year and name, those without year last."""
    years = dict(zip(studies["study"], studies["year"], strict=True))
    found = []
    for name, group in rows.groupby("study", sort=False):
        cells = tuple(_cell(record, anchors) for record in records(group))
        missing, total = _arms_of(group)
        year = numbers.typed(years.get(name))
        study = GapStudy(str(name), year_beside(str(name), year), cells, missing, total)
        found.append(((year or "9999", str(name)), study))
    return tuple(study for _, study in sorted(found, key=lambda pair: pair[0]))


def gap_counts(rows: pd.DataFrame) -> tuple[GapCount, ...]:
    """Counts by outcome and side of the comparison."""
    found = []
    for outcome, group in rows.groupby("outcome", sort=False):
        for arm in arms.ARMS:
            once = group.drop_duplicates(["study", f"{arm}_arm"])
            missing = int((once[f"{arm}_sd_source"] == "none").sum())
            pooled = int((once[f"{arm}_sd_pooled"] & (once[f"{arm}_sd_source"] != "none")).sum())
            found.append(GapCount(str(outcome), arm, len(once), missing, pooled))
    return tuple(found)


def _cell(record: Record, anchors: dict[str, str]) -> GapCell:
    states = {arm: str(record[f"{arm}_sd_source"]) for arm in arms.ARMS}
    words = "; ".join(f"{arm}: {STATE_WORDS[states[arm]]}" for arm in arms.ARMS)
    title = f"{record['row_id']} ({record['outcome']}). {words}"
    row_id = str(record["row_id"])
    return GapCell(row_id, anchors.get(row_id, ""), states["control"], states["treatment"], title)


def _arms_of(group: pd.DataFrame) -> tuple[int, int]:
    known: dict[str, bool] = {}
    for arm in arms.ARMS:
        for name, source in zip(group[f"{arm}_arm"], group[f"{arm}_sd_source"], strict=True):
            known[name] = known.get(name, True) and source == "none"
    return sum(known.values()), len(known)
