"""Looks through a workbook before anything else opens it."""

from __future__ import annotations

import io
import zipfile
from dataclasses import dataclass, field

from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken


@dataclass(frozen=True)
class Inspection:
    """What the guard saw.

    Parameters
    ----------
    broken : cells without a usable value, by sheet, then by (row, column) from 0
    macros : True when the workbook holds macros
    """

    broken: dict[str, dict[tuple[int, int], Broken]] = field(default_factory=dict)
    macros: bool = False


def inspect(content: bytes, file: str) -> Inspection:
    """Look through the workbook ``content``.

    Raises
    ------
    SheetProblem
        When it is no workbook.
    """
    if not zipfile.is_zipfile(io.BytesIO(content)):
        raise SheetProblem("is no workbook; save it as .xlsx", file)
    return Inspection()
