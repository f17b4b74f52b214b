"""How many rows came in, who left by which rule, who is left: counts that must add up."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from drystone.report import numbers
from drystone.report.facts import AnalysisFacts, ReportFacts, StrategyFacts, main_model


@dataclass(frozen=True)
class Left:
    """Rows that left by one rule; ``reason`` is that of the first of them."""

    rows: int
    rule: str
    reason: str


@dataclass(frozen=True)
class RowFlow:
    """Rows of the sheet on their way into one analysis under one strategy."""

    rows_in: int
    elsewhere: int
    left: tuple[Left, ...]
    usable: int
    left_here: tuple[Left, ...]
    used: int

    @property
    def gone(self) -> int:
        """Rows that left, under any rule."""
        return sum(item.rows for item in (*self.left, *self.left_here))

    @property
    def adds_up(self) -> bool:
        """Whether rows in = elsewhere + left + used, before and within the strategy."""
        before = self.elsewhere + sum(item.rows for item in self.left) + self.usable
        return before == self.rows_in and self.usable - self.used == self.gone_here

    @property
    def gone_here(self) -> int:
        """Rows that left under this strategy."""
        return sum(item.rows for item in self.left_here)

    @property
    def check(self) -> str:
        """Sentence that shows the sum, or says that it fails."""
        parts = [f"{numbers.whole(self.used)} used", f"{numbers.whole(self.gone)} left"]
        if self.elsewhere:
            parts.append(f"{numbers.whole(self.elsewhere)} of other questions")
        total = self.used + self.gone + self.elsewhere
        if self.adds_up:
            return f"The counts add up: {' + '.join(parts)} = {numbers.whole(self.rows_in)}."
        return (
            f"The counts do not add up: {' + '.join(parts)} = {numbers.whole(total)}, but the "
            f"sheet has {numbers.count(self.rows_in, 'row')}. Do not use these results before "
            "the ledger is mended."
        )


def row_flow(facts: ReportFacts, analysis: AnalysisFacts, strategy: StrategyFacts) -> RowFlow:
    """Flow into the overall model of ``analysis`` under ``strategy``."""
    model = main_model(strategy)
    used = len(strategy.sampling)
    if model is not None and not model.refused:
        used = int(model.coefficients["rows"].iloc[0])
    return RowFlow(
        facts.flow.rows_in,
        len(analysis.elsewhere),
        _by_rule(_before(facts.ledger, analysis)),
        len(analysis.slice),
        _by_rule(_here(facts.ledger, analysis, strategy.name, model.name if model else "")),
        used,
    )


def blank(column: pd.Series) -> pd.Series:
    """Where a text column says nothing."""
    return column.isna() | (column == "")


def ledger_of(ledger: pd.DataFrame, analysis: AnalysisFacts) -> pd.DataFrame:
    """Entries that concern ``analysis``, those of the check included."""
    mine = blank(ledger["analysis"]) | (ledger["analysis"] == analysis.name)
    return ledger[mine & ~ledger["row_id"].isin(analysis.elsewhere)]


def _before(ledger: pd.DataFrame, analysis: AnalysisFacts) -> pd.DataFrame:
    mine = ledger_of(ledger, analysis)
    return mine[blank(mine["strategy"]) & blank(mine["model"])].drop_duplicates("row_id")


def _here(ledger: pd.DataFrame, analysis: AnalysisFacts, strategy: str, model: str) -> pd.DataFrame:
    mine = ledger_of(ledger, analysis)
    before = set(_before(ledger, analysis)["row_id"])
    reaches = (blank(mine["strategy"]) | (mine["strategy"] == strategy)) & (
        blank(mine["model"]) | (mine["model"] == model)
    )
    return mine[reaches & ~mine["row_id"].isin(before)].drop_duplicates("row_id")


def _by_rule(entries: pd.DataFrame) -> tuple[Left, ...]:
    groups = entries.groupby("rule", sort=False)
    found = [Left(len(part), str(rule), str(part["reason"].iloc[0])) for rule, part in groups]
    return tuple(sorted(found, key=lambda item: -item.rows))
