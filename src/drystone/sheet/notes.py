"""A finding on its way: what it says and which rows it concerns."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Note:
    """One finding, before row names and sheet names are filled in.

    Parameters
    ----------
    level : one of `drystone.words.levels`
    rule : short name of the rule
    wrong, todo : what is wrong, what to do
    column : drystone's name of the column
    row : entry of the comparisons table, from 0; None when the finding is about no single row
    cell, value : address, and the cell as typed
    sheet : sheet or file; blank means the comparisons table
    leaves : further entries that leave with a finding of level stop
    """

    level: str
    rule: str
    wrong: str
    todo: str
    column: str = ""
    row: int | None = None
    cell: str = ""
    value: str = ""
    sheet: str = ""
    leaves: tuple[int, ...] = ()
