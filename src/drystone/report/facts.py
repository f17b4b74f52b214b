"""What the page is made from: plain frozen containers of settings and result tables.

A stage fills these from the cached tables; nothing here reads a file. Every DataFrame follows the
schema named beside it, with missing numbers as NaN and missing text as None or NaN. Tables may be
empty but always carry their columns.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import pandas as pd

from drystone.settings import model as settings_model
from drystone.settings.formulas import is_intercept_only
from drystone.words import scales

Record = dict[str, Any]  # one row of a table by column name; pandas gives keys of any kind


@dataclass(frozen=True)
class MadeFrom:
    """Where the page comes from.

    Parameters
    ----------
    run_id : name of the run; printed in the stamp
    versions : software by name, for example {"drystone": "0.1.0", "Python": "3.11.7"}
    inputs : optional, input file -> SHA-256
    made_on : optional, date as text; blank keeps the page free of the clock
    """

    run_id: str
    versions: Mapping[str, str]
    inputs: Mapping[str, str] = field(default_factory=dict)
    made_on: str = ""


@dataclass(frozen=True)
class Flow:
    """How many rows and studies the sheet holds; who left is counted from the ledger.

    Parameters
    ----------
    rows_in : rows of the comparisons sheet
    studies_in : distinct studies in it
    """

    rows_in: int
    studies_in: int


@dataclass(frozen=True)
class ModelFacts:
    """One model under one strategy.

    Parameters
    ----------
    name : name in the config
    formula : as in the config, for example "~ 1"
    coefficients : tables.results.COEFFICIENTS; a refused model has one row with `refused` filled
    components : tables.results.COMPONENTS; empty when refused
    heterogeneity : tables.results.HETEROGENEITY, one row; empty when refused
    """

    name: str
    formula: str
    coefficients: pd.DataFrame
    components: pd.DataFrame
    heterogeneity: pd.DataFrame

    @property
    def refused(self) -> str:
        """Why there is no result; blank when there is one."""
        for reason in self.coefficients["refused"]:
            if isinstance(reason, str) and reason:
                return reason
        return "" if len(self.coefficients) else "the model gave no coefficient"

    @property
    def is_overall(self) -> bool:
        """Whether the model has no moderator."""
        return is_intercept_only(self.formula)

    @property
    def warnings(self) -> tuple[str, ...]:
        """Sentences about this fit, each once."""
        lines: list[str] = []
        for text in self.coefficients["warnings"]:
            lines += text.splitlines() if isinstance(text, str) else []
        return tuple(dict.fromkeys(line.strip() for line in lines if line.strip()))

    def overall(self) -> pd.Series | None:
        """Row of the overall effect, or None when refused or absent."""
        if self.refused:
            return None
        found = self.coefficients[self.coefficients["coefficient"] == scales.OVERALL]
        return found.iloc[0] if len(found) else None


@dataclass(frozen=True)
class StrategyFacts:
    """One analysis under one strategy.

    Parameters
    ----------
    name : as in ``Settings.all_strategies()``; `row_set` in the side-by-side table goes with it
    settings : the strategy's settings
    sampling : tables.effects.SAMPLING, the rows that this strategy uses
    covariance : tables.effects.COVARIANCE
    averages : tables.effects.AVERAGES; empty for a strategy that borrows nothing
    models : in the order of the config
    """

    name: str
    settings: settings_model.Strategy
    sampling: pd.DataFrame
    covariance: pd.DataFrame
    averages: pd.DataFrame
    models: tuple[ModelFacts, ...]

    def model(self, name: str) -> ModelFacts | None:
        """Model called ``name``, or None."""
        return next((model for model in self.models if model.name == name), None)


@dataclass(frozen=True)
class AnalysisFacts:
    """One question.

    Parameters
    ----------
    name : name in the config (or of the outcome)
    settings : the analysis' settings
    slice : tables.effects.SLICE_COLUMNS plus one column per moderator: the rows that at least
        one strategy can use
    effects : tables.effects.EFFECTS, same rows
    strategies : in the order of ``Settings.all_strategies()``
    side_by_side : tables.results.SIDE_BY_SIDE
    elsewhere : ids of the sheet's rows whose outcome is a known one that this question does not
        ask for; so that rows_in = elsewhere + distinct rows in the ledger (analysis blank or this
        one, strategy and model blank, not elsewhere) + rows of the slice
    """

    name: str
    settings: settings_model.Analysis
    slice: pd.DataFrame
    effects: pd.DataFrame
    strategies: tuple[StrategyFacts, ...]
    side_by_side: pd.DataFrame
    elsewhere: frozenset[str] = frozenset()

    def strategy(self, name: str) -> StrategyFacts | None:
        """Strategy called ``name``, or None."""
        return next((item for item in self.strategies if item.name == name), None)


@dataclass(frozen=True)
class ReportFacts:
    """Everything that the page says.

    Parameters
    ----------
    review_name : printed as the title
    made_from : run and software
    settings : the whole config
    flow : rows and studies of the sheet
    findings : tables.check.FINDINGS
    ledger : tables.check.LEDGER, entries of the check, of each analysis and of each strategy
        together; `analysis`, `strategy` and `model` say how far an entry reaches
    derivations : tables.check.DERIVATIONS
    studies : tables.studies.SCHEMA; may be empty
    analyses : in the order of the config
    demo : True when data are invented; the page then says so at the top
    """

    review_name: str
    made_from: MadeFrom
    settings: settings_model.Settings
    flow: Flow
    findings: pd.DataFrame
    ledger: pd.DataFrame
    derivations: pd.DataFrame
    studies: pd.DataFrame
    analyses: tuple[AnalysisFacts, ...]
    demo: bool = False


def main_strategy(facts: ReportFacts, analysis: AnalysisFacts) -> StrategyFacts:
    """Strategy that the team declared as the main one, or the first that ran.

    Raises
    ------
    ValueError
        When the analysis has no strategy at all.
    """
    if not analysis.strategies:
        raise ValueError(f"analysis '{analysis.name}' has no strategy, so there is nothing to show")
    return analysis.strategy(facts.settings.primary) or analysis.strategies[0]


def main_model(strategy: StrategyFacts) -> ModelFacts | None:
    """First model without moderators, which the first screen speaks about, or None."""
    return next((model for model in strategy.models if model.is_overall), None)


def number_of(row: pd.Series | None, name: str) -> float:
    """Number in ``row``; NaN when there is no row."""
    return math.nan if row is None else float(row[name])


def records(table: pd.DataFrame) -> list[Record]:
    """Rows of ``table`` as dictionaries."""
    return [{str(name): value for name, value in row.items()} for row in table.to_dict("records")]
