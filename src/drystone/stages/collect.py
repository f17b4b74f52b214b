"""Reads the cached tables of a whole review, for the report and for publishing.

Labels, addresses and years decide no number, so the slice does not hold them; they are joined here,
where they are shown.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

import pandas as pd

from drystone.stages.intake_store import load_table
from drystone.tables import check, effects
from drystone.tables.effects import SHOWN_COLUMNS
from drystone.tables.store import conform, read_table

if TYPE_CHECKING:
    from drystone.settings.model import Analysis, Settings, Strategy


@dataclass(frozen=True)
class Place:
    """Where the results of one analysis, strategy and model lie in the cache."""

    analysis: str
    strategy: str
    model: str
    folder: Path

    def table(self, name: str) -> pd.DataFrame:
        """Coefficients, components or heterogeneity of the model."""
        return read_table(self.folder / f"{name}.parquet")


def analysis_folder(root: Path, name: str) -> Path:
    """Folder of one analysis in the cache."""
    return root / "cache" / "analyses" / name


def places(root: Path, settings: Settings) -> Iterator[Place]:
    """Every model of every strategy of every analysis, in the order of the config."""
    for name, analysis in settings.all_analyses().items():
        for strategy in settings.all_strategies():
            for model in analysis.models:
                folder = analysis_folder(root, name) / strategy / model
                yield Place(name, strategy, model, folder)


def shown_slice(root: Path, name: str, intake: Path) -> pd.DataFrame:
    """Slice of the analysis with labels, addresses and years beside the numbers."""
    rows = read_table(analysis_folder(root, name) / "slice.parquet")
    sheet = load_table(intake, "rows")
    shown = [column for column in SHOWN_COLUMNS if column in sheet.columns]
    missing = [column for column in shown if column not in rows.columns]
    return rows.merge(sheet[["row_id", *missing]], on="row_id", how="left")


def whole_ledger(root: Path, settings: Settings, intake: Path) -> pd.DataFrame:
    """Every row that left, with how far its entry reaches and where it stands in the sheet."""
    parts = [load_table(intake, "ledger")]
    for name, analysis in settings.all_analyses().items():
        parts.extend(_analysis_ledger(root, name, analysis, settings.all_strategies()))
    table = pd.concat([part for part in parts if len(part)] or parts[:1], ignore_index=True)
    where = load_table(intake, "rows").drop_duplicates("row_id").set_index("row_id")
    later = table["sheet_row"] == 0
    table["sheet"] = table["sheet"].where(~later, table["row_id"].map(where["sheet"]))
    rows = table["row_id"].map(where["sheet_row"]).fillna(0)
    table["sheet_row"] = table["sheet_row"].where(~later, rows).astype("int64")
    return conform(table, check.LEDGER)


def whole_derivations(root: Path, settings: Settings, intake: Path) -> pd.DataFrame:
    """SDs that the check computed, and those that a slice read from another row, each once."""
    parts = [load_table(intake, "derivations")]
    for name in settings.all_analyses():
        parts.append(read_table(analysis_folder(root, name) / "derivations.parquet"))
    filled = [part for part in parts if len(part)] or parts[:1]
    table = pd.concat(filled, ignore_index=True).drop_duplicates()
    return conform(table, check.DERIVATIONS)


def elsewhere(rows: pd.DataFrame, analysis: Analysis, settings: Settings) -> frozenset[str]:
    """Ids of rows whose outcome is a known one that the analysis does not ask for."""
    other = rows["outcome"].isin(settings.outcomes) & ~rows["outcome"].isin(analysis.outcome)
    return frozenset(rows.loc[other, "row_id"])


def averages_of(root: Path, name: str, strategy: str) -> pd.DataFrame:
    """Averages that one strategy plugged in."""
    path = analysis_folder(root, name) / strategy / "averages.parquet"
    return read_table(path, effects.AVERAGES)


def _analysis_ledger(
    root: Path, name: str, analysis: Analysis, strategies: dict[str, Strategy]
) -> Iterator[pd.DataFrame]:
    folder = analysis_folder(root, name)
    yield _labelled(folder / "ledger.parquet", name)
    for strategy in strategies:
        yield _labelled(folder / strategy / "ledger.parquet", name, strategy)
        for model in analysis.models:
            yield _labelled(folder / strategy / model / "ledger.parquet", name, strategy, model)


def _labelled(path: Path, analysis: str, strategy: str = "", model: str = "") -> pd.DataFrame:
    table = read_table(path)
    table["analysis"] = analysis
    table["strategy"] = strategy or None
    table["model"] = model or None
    return table
