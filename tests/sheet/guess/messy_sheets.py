"""Invented sheets in other people's layouts, for the tests of the guesses."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any

from drystone.sheet.guess.proposal import Proposal, propose
from drystone.sheet.raw import RawSheet
from drystone.sheet.readers import read_sheet
from drystone.sheet.sources import Source, read_sources

Row = Sequence[Any]
STUDIES = ("Alder 2001", "Birch & Moss 2004", "Alder 2001", "Cress et al. 2010")
# study, then mean, SD, n of the control, then of the treatment
NUMBERS: list[Row] = [
    (STUDIES[0], 4.1, 0.5, 4, 5.2, 0.75, 5),
    (STUDIES[1], 3.2, 0.4, 6, 3.9, 0.6, 6),
    (STUDIES[2], 2.8, 0.7, 3, 4.4, 0.9, 3),
    (STUDIES[3], 6.0, 1.1, 8, 6.6, 1.3, 8),
]
ARM_COLUMNS = tuple(
    f"{arm}_{what}" for arm in ("control", "treatment") for what in ("mean", "sd", "n")
)


def guess(*grid: Row, **others: Sequence[Row]) -> Proposal:
    """Proposal for a sheet with the given lines, other sheets beside it."""
    sources = [Source("data", list(grid)), *(Source(name, list(g)) for name, g in others.items())]
    return propose(sources, "x.xlsx")


def mapping(proposal: Proposal) -> dict[str, str]:
    return {found.ours: found.theirs for found in proposal.columns}


def of_file(path: Path) -> tuple[Proposal, RawSheet]:
    """Proposal for a file, and the file read as proposed."""
    proposal = propose(read_sources(path), path.name)
    columns = mapping(proposal)
    return proposal, read_sheet(path, columns, proposal.layout)


def write(path: Path, lines: Sequence[Row], sign: str = ",", encoding: str = "utf-8") -> Path:
    text = "\n".join(sign.join("" if c is None else str(c) for c in line) for line in lines)
    path.write_bytes((text + "\n").encode(encoding))
    return path
