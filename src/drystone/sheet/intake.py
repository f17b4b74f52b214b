"""From the tables as typed to typed rows, findings, ledger and derivations."""

from __future__ import annotations

from dataclasses import dataclass

import pandas as pd

from drystone.settings.model import Settings
from drystone.sheet.answers import Answers
from drystone.sheet.draft import Draft
from drystone.sheet.findings import STEPS
from drystone.sheet.findings.answered import sort_answered
from drystone.sheet.finish import (
    accepted_table,
    derivation_table,
    finding_table,
    ledger_table,
    row_table,
)
from drystone.sheet.headers import ALWAYS_NEEDED, match_headers, require
from drystone.sheet.notes import Note
from drystone.sheet.raw import RawSheet, letters
from drystone.sheet.study_table import open_studies, study_table
from drystone.tables.comparisons import COLUMNS
from drystone.words import levels


@dataclass(frozen=True)
class Intake:
    """The sheet, typed and checked.

    Parameters
    ----------
    rows : every row of the sheet: our columns, where each row stands, the SD to use, moderators,
        and what the studies table says of its study
    studies : one row = one study; columns as in `drystone.tables.studies`
    accepted : findings that a person accepted, with the decision; they are not in ``findings``
    findings, ledger, derivations : as in `drystone.tables.check`; every row is either usable or
        in the ledger, once
    columns : where each of our columns stands: letter and header as typed
    moderators : names of the sheet's other columns
    unnamed : places of rows whose row_id is a temporary name
    """

    rows: pd.DataFrame
    studies: pd.DataFrame
    findings: pd.DataFrame
    accepted: pd.DataFrame
    ledger: pd.DataFrame
    derivations: pd.DataFrame
    columns: dict[str, tuple[str, str]]
    moderators: tuple[str, ...]
    unnamed: frozenset[int] = frozenset()

    @property
    def usable(self) -> pd.DataFrame:
        """Rows that did not leave, in sheet order; their row_id is unique."""
        left = set(self.ledger["sheet_row"])
        return self.rows[~self.rows["sheet_row"].isin(left)].reset_index(drop=True)


def take_in(raw: RawSheet, settings: Settings, answers: Answers | None = None) -> Intake:
    """Type and check the sheet. No content of a cell makes this fail.

    Parameters
    ----------
    answers : what people decided about findings; lines without a digest are bound in there

    Raises
    ------
    SheetProblem
        When a needed column is missing, a header is ambiguous, or the config maps a column that
        is not there.
    """
    draft, notes = _open(raw, settings)
    draft.answers = answers or Answers()
    notes.extend(open_studies(draft))
    for step in STEPS:
        notes.extend(step(draft))
    unanswered, accepted = sort_answered(draft, notes)
    findings, ledger = finding_table(draft, unanswered), ledger_table(draft, notes)
    places = {name: draft.found[name] for name in COLUMNS if name in draft.found}
    return Intake(
        rows=row_table(draft),
        studies=study_table(draft),
        findings=findings,
        accepted=accepted_table(draft, accepted),
        ledger=ledger,
        derivations=derivation_table(draft),
        columns={
            name: (letters(raw.comparisons.positions[place]), raw.comparisons.headers[place])
            for name, place in places.items()
        },
        moderators=tuple(draft.extras),
        unnamed=frozenset(draft.unnamed),
    )


def _open(raw: RawSheet, settings: Settings) -> tuple[Draft, list[Note]]:
    table = raw.comparisons
    found = match_headers(table, list(COLUMNS), settings.columns, raw.file)
    needed = (*ALWAYS_NEEDED, *(("outcome",) if len(settings.outcomes) > 1 else ()))
    require(table, found, needed, raw.file)
    used = set(found.values())
    extras = {name: i for i, name in enumerate(table.headers) if i not in used}
    taken = [name for name in extras if name in RESERVED]
    notes = [*raw.remarks, *(_reserved(raw, name, extras[name]) for name in taken)]
    return Draft(raw, settings, found, {k: v for k, v in extras.items() if k not in taken}), notes


def _reserved(raw: RawSheet, name: str, place: int) -> Note:
    return Note(
        levels.WARN,
        "reserved name",
        f"the column '{name}' is ignored: drystone uses this name for something else",
        "rename the column, or map it under 'columns' in the config",
        cell=raw.comparisons.header_address(place),
        value=name,
    )


RESERVED = frozenset(COLUMNS) | {
    "sheet",
    "sheet_row",
    "control_sd_value",
    "treatment_sd_value",
    "control_sd_rule",
    "treatment_sd_rule",
    "sd_pooled",
    "study_year",
    "study_status",
    "study_citation",
}
