"""From the draft and its notes to the tables that the check hands on."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd

from drystone.sheet.draft import Draft
from drystone.sheet.findings.answered import Accepted
from drystone.sheet.notes import Note
from drystone.tables.check import ACCEPTED, DERIVATIONS, FINDINGS, LEDGER
from drystone.tables.comparisons import COLUMNS
from drystone.tables.store import conform, empty_table
from drystone.words import arms, levels

ABOUT_IDENTITY = "repeated row_id"  # said even of rows that the team left out


def row_table(draft: Draft) -> pd.DataFrame:
    """Every row of the sheet, typed: numbers as float64, texts with NaN where missing."""
    columns: dict[str, Any] = {name: _typed(draft, name) for name in COLUMNS}
    columns.update(_where(draft))
    columns.update({name: _typed(draft, name) for name in draft.extras})
    by_study = {study: i for i, study in reversed(list(enumerate(draft.studies["study"])))}
    places = [by_study.get(study) for study in draft.text("study")]
    for name, kind in (("year", "float64"), ("status", "str"), ("citation", "str")):
        values = [None if p is None else draft.studies[name][p] for p in places]
        columns[f"study_{name}"] = pd.Series(values, dtype=kind)
    return pd.DataFrame(columns)


def finding_table(draft: Draft, notes: Sequence[Note]) -> pd.DataFrame:
    """One row = one finding, in the order of the rules, then of the sheet."""
    kept = [note for note in notes if _speaks(draft, note)]
    if not kept:
        return empty_table(FINDINGS)
    return conform(pd.DataFrame(_cells(draft, kept)).astype("str"), FINDINGS)


def accepted_table(draft: Draft, accepted: Sequence[Accepted]) -> pd.DataFrame:
    """One row = one finding that a person accepted, with the decision."""
    kept = [(note, answer) for note, answer in accepted if _speaks(draft, note)]
    if not kept:
        return empty_table(ACCEPTED)
    cells = _cells(draft, [note for note, _ in kept])
    for name in ("decision", "reason", "who", "date"):
        cells[name] = [getattr(answer, name) or None for _, answer in kept]
    return conform(pd.DataFrame(cells).astype("str"), ACCEPTED)


def _speaks(draft: Draft, note: Note) -> bool:
    return note.row is None or note.row not in draft.left_out or note.rule == ABOUT_IDENTITY


def _cells(draft: Draft, kept: Sequence[Note]) -> dict[str, list[Any]]:
    row_ids = draft.text("row_id")
    return {
        "level": [note.level for note in kept],
        "rule": [note.rule for note in kept],
        "sheet": [note.sheet or draft.table.name for note in kept],
        "cell": [note.cell for note in kept],
        "row_id": [None if note.row is None else row_ids[note.row] for note in kept],
        "column": [note.column for note in kept],
        "value": [note.value for note in kept],
        "wrong": [note.wrong for note in kept],
        "todo": [note.todo for note in kept],
    }


def ledger_table(draft: Draft, notes: Sequence[Note]) -> pd.DataFrame:
    """One row = one row of the sheet that cannot be used; the first reason wins."""
    left = dict(draft.left_out)
    for note in notes:
        if note.level == levels.STOP:
            rows = note.leaves if note.row is None else (note.row, *note.leaves)
            for row in rows:
                left.setdefault(row, (note.rule, note.wrong))
    if not left:
        return empty_table(LEDGER)
    order = sorted(left)
    table = pd.DataFrame(
        {
            **{name: pd.Series([None] * len(order)) for name in ("analysis", "strategy", "model")},
            "row_id": [draft.text("row_id")[row] for row in order],
            "study": [draft.text("study")[row] for row in order],
            "sheet": draft.table.name,
            "sheet_row": [draft.table.row_numbers[row] for row in order],
            "rule": [left[row][0] for row in order],
            "reason": [left[row][1] for row in order],
        }
    )
    texts = {name: "str" for name in table.columns if name != "sheet_row"}
    return conform(table.astype(texts), LEDGER)


def derivation_table(draft: Draft) -> pd.DataFrame:
    """One row = one SD that was computed from something else, in sheet order."""
    if not draft.derivations:
        return empty_table(DERIVATIONS)
    ordered = sorted(draft.derivations, key=lambda record: (record["row"], record["arm"]))
    table = pd.DataFrame(ordered).drop(columns="row")
    texts = {name: "str" for name in table.columns if name != "sd"}
    return conform(table.astype(texts), DERIVATIONS)


def _where(draft: Draft) -> dict[str, Any]:
    found: dict[str, Any] = {
        "sheet": pd.Series([draft.table.name] * draft.size, dtype="str"),
        "sheet_row": np.array(draft.table.row_numbers, dtype=np.int64),
    }
    for arm in arms.ARMS:
        found[f"{arm}_sd_value"] = draft.sds[arm]
    for arm in arms.ARMS:
        found[f"{arm}_sd_rule"] = pd.Series(draft.sd_rules[arm], dtype="str")
    found["sd_pooled"] = draft.pooled
    return found


def _typed(draft: Draft, name: str) -> Any:
    if name in draft.numbers:
        return draft.numbers[name]
    return pd.Series(draft.texts[name], dtype="str")
