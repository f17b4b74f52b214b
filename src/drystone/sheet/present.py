"""Findings for people: one line for each kind, and a CSV file that a spreadsheet opens safely."""

from __future__ import annotations

import csv
import os
from dataclasses import dataclass
from pathlib import Path

import pandas as pd

from drystone.words import levels

SHOWN = 3  # addresses in a line
_DANGEROUS = ("=", "+", "-", "@", "\t", "\r")


@dataclass(frozen=True)
class Line:
    """All findings of one rule about one column, or about the same column of both arms.

    Parameters
    ----------
    level, rule, column, sheet : what the findings share
    count : how many there are
    cells : the first addresses
    wrong, todo : of the first finding
    """

    level: str
    rule: str
    column: str
    sheet: str
    count: int
    cells: tuple[str, ...]
    wrong: str
    todo: str

    def __str__(self) -> str:
        """Give the line as text."""
        more = ", ..." if self.count > len(self.cells) > 0 else ""
        where = " ".join(part for part in (self.sheet, ", ".join(self.cells) + more) if part)
        topic = f"{self.rule} ({self.column})" if self.column else self.rule
        times = f", {self.count} times" if self.count > 1 else ""
        return f"{self.level}: {topic}{times}, {where}: {self.wrong}. {_sentence(self.todo)}"


def collapse(findings: pd.DataFrame) -> list[Line]:
    """One line for each level, rule, sheet and column: stop first, then ask, warn, fixed.

    The same column of both arms makes one line.

    Parameters
    ----------
    findings : as in `drystone.tables.check.FINDINGS`
    """
    if findings.empty:
        return []
    keys = ["level", "rule", "sheet"]
    filled = findings.fillna("")
    topic = filled["column"].str.removeprefix("control_").str.removeprefix("treatment_")
    lines = [
        _line(dict(zip(keys, map(str, key[:3]), strict=True)), group)
        for key, group in filled.groupby([*(filled[key] for key in keys), topic], sort=False)
    ]
    return sorted(lines, key=lambda line: levels.LEVELS.index(line.level))


def findings_csv(findings: pd.DataFrame, path: Path) -> None:
    """Write ``findings`` to ``path`` in one move, without a cell that a spreadsheet would run."""
    path.parent.mkdir(parents=True, exist_ok=True)
    partial = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        with partial.open("w", encoding="utf-8-sig", newline="") as stream:
            writer = csv.writer(stream, lineterminator="\n")
            writer.writerow(findings.columns)
            for row in findings.fillna("").itertuples(index=False):
                writer.writerow([harmless(str(value)) for value in row])
        os.replace(partial, path)
    finally:
        partial.unlink(missing_ok=True)


def harmless(text: str) -> str:
    """Text that no spreadsheet takes for a formula.

    Examples
    --------
    >>> harmless("=1+1")
    "'=1+1"
    """
    return f"'{text}" if text.startswith(_DANGEROUS) else text


def _line(shared: dict[str, str], group: pd.DataFrame) -> Line:
    cells = [cell for cell in group["cell"].head(SHOWN) if cell]
    first = group.iloc[0]
    return Line(
        **shared,
        column=", ".join(dict.fromkeys(map(str, group["column"]))),
        count=len(group),
        cells=tuple(cells),
        wrong=str(first["wrong"]),
        todo=str(first["todo"]),
    )


def _sentence(text: str) -> str:
    return f"{text[:1].upper()}{text[1:]}."
