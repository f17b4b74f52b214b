"""Derivations: how an SD came to be, with the cells that went in."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from drystone.sheet.draft import Draft
from drystone.sheet.raw import show
from drystone.words import arms


def derive(
    draft: Draft,
    arm: str,
    row: int,
    rule: str,
    columns: Sequence[str],
    assumption: str,
) -> None:
    """Record that the SD of ``arm`` in ``row`` was computed from ``columns`` by ``rule``."""
    draft.derivations.append(
        {
            "row": row,
            "row_id": draft.text("row_id")[row],
            "study": draft.text("study")[row],
            "arm": arm,
            "sd": float(draft.sds[arm][row]),
            "rule": rule,
            "inputs": "; ".join(input_words(draft, column, row) for column in columns),
            "assumptions": assumption + _borrowed(draft, columns, row),
        }
    )


def of_arm(arm: str, names: Sequence[str]) -> list[str]:
    """Columns of one arm by their names without it; columns of the row stay as they are."""
    return [name if name == "confidence_percent" else f"{arm}_{name}" for name in names]


def input_words(draft: Draft, column: str, row: int) -> str:
    """Address, name and value of one input."""
    value = draft.number(column)[row]
    if np.isnan(value):
        blank = {"confidence_percent": "95", "error_df": "control_n + treatment_n - 2"}
        return f"{column} = {blank.get(column, 'none')} (blank)"
    return f"{draft.cell(column, row)} {column} = {show(float(value))}".strip()


def _borrowed(draft: Draft, columns: Sequence[str], row: int) -> str:
    counts = [f"{arm}_n" for arm in arms.ARMS if f"{arm}_n" in columns]
    if all(draft.cell(name, row) and draft.typed(name, row).strip() for name in counts):
        return ""
    return f"; n is not typed but borrowed ({draft.settings.missing_n})"
