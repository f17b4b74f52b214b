"""Whether a typed SD and a typed spread of the same arm say the same."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.conversion import ArmNumbers, Conversion
from drystone.sheet.draft import Draft, Floats, Mask, where
from drystone.sheet.notes import Note
from drystone.sheet.rounding import half_unit
from drystone.words import levels

SAME = 0.02  # relative difference that is not worth a question


def disagreeing(
    draft: Draft,
    arm: str,
    conversion: Conversion[ArmNumbers],
    rows: Mask,
    typed: Floats,
    converted: Floats,
) -> Iterator[Note]:
    """Ask about rows whose typed and converted SDs differ by more than rounding can explain."""
    for row in where(rows):
        first, second = float(typed[row]), float(converted[row])
        room = SAME * max(abs(first), abs(second)) + half_unit(first)
        room += _rounding(draft, arm, conversion, row, second)
        if abs(first - second) <= room:
            continue
        yield draft.note(
            levels.ASK,
            "SD and spread disagree",
            f"{arm}_sd",
            row,
            f"the SD is {first:.6g}, but {draft.cell(f'{arm}_{conversion.inputs[0]}', row)} gives "
            f"{second:.6g} ({conversion.rule}); the typed SD is used until somebody decides",
            "look both up; blank the wrong one",
        )


def _rounding(
    draft: Draft, arm: str, conversion: Conversion[ArmNumbers], row: int, sd: float
) -> float:
    """Part of ``sd`` that rounding of the typed spread can explain."""
    if conversion.inputs[0] != "spread":
        return 0.0
    spread = float(draft.number(f"{arm}_spread")[row])
    with np.errstate(all="ignore"):
        part = half_unit(spread) * sd / spread if spread else 0.0
    return float(part) if np.isfinite(part) else 0.0
