"""What ``drystone answer`` does: writes decisions about findings into answers.csv."""

from __future__ import annotations

import csv
import io
from dataclasses import dataclass
from datetime import date
from pathlib import Path

import pandas as pd

from drystone.driving.plan import make_plan
from drystone.settings.problems import ConfigProblem, nearest
from drystone.tables.atomic import write_text
from drystone.words import levels
from drystone.words.decisions import ACCEPT, DECISIONS

EVERY_ROW = "*"


@dataclass(frozen=True)
class Decision:
    """What a person decides about findings.

    Parameters
    ----------
    row : row_id; '*' for every row with such an open finding, blank for the sheet as a whole
    rule, decision, reason, who : as in answers.csv
    """

    row: str
    rule: str
    decision: str
    reason: str
    who: str


def answer(folder: Path, decided: Decision, today: date | None = None) -> list[str]:
    """Write ``decided`` into the answers of the review in ``folder``; names of the rows.

    Raises
    ------
    ConfigProblem
        When there is no such open finding, the decision is unknown, or the reason is missing.
    """
    plan = make_plan(folder.resolve())
    findings = plan.state.table("findings").fillna("")
    _refuse(decided)
    rows = _rows(findings, decided)
    digests = _digests(plan.review.root, rows, decided.rule)
    day = (today or date.today()).isoformat()
    lines = [
        [
            row,
            decided.rule,
            decided.decision,
            decided.reason,
            decided.who,
            day,
            digests[row],
        ]
        for row in rows
    ]
    _append(plan.review.answers, lines)
    return rows


def _refuse(decided: Decision) -> None:
    if decided.decision not in DECISIONS:
        known = "; ".join(f"'{word}': {meaning}" for word, meaning in DECISIONS.items())
        raise ConfigProblem(f"'{decided.decision}' is no decision; there are {known}")
    if not decided.reason.strip():
        raise ConfigProblem("a decision needs a reason; give it with --reason")


def _rows(findings: pd.DataFrame, decided: Decision) -> list[str]:
    """Rows with an open finding that the decision can be about."""
    every = decided.row == EVERY_ROW
    of_row = findings if every else findings[findings["row_id"] == decided.row]
    found = of_row[of_row["rule"] == decided.rule]
    if found.empty:
        where = "no row" if every else f"row '{decided.row}'" if decided.row else "the sheet"
        rules = set(of_row["rule"])
        hint = nearest(decided.rule, rules) if rules else "it has no open findings"
        raise ConfigProblem(f"{where} has no open finding '{decided.rule}': {hint}")
    if decided.decision == ACCEPT and (found["level"] == levels.STOP).any():
        raise ConfigProblem(
            f"'{decided.rule}' is of level stop and cannot be accepted; mend the row, or decide "
            "'leave out'"
        )
    if decided.decision != ACCEPT and (found["row_id"] == "").any():
        raise ConfigProblem(f"'{decided.rule}' is about the whole sheet; only a row can leave")
    return list(dict.fromkeys(found["row_id"]))


def _digests(root: Path, rows: list[str], rule: str) -> dict[str, str]:
    """Digest of each row as it is now; see `drystone.sheet.answers`."""
    from drystone.driving.review import open_review
    from drystone.sheet.answers import Answer, Answers
    from drystone.sheet.intake import take_in
    from drystone.sheet.readers import read_sheet

    review = open_review(root)
    raw = read_sheet(review.sheet_path(), review.settings.columns, review.settings.layout)
    asked = {(row, rule): Answer(row, rule, ACCEPT) for row in rows}
    answers = Answers(asked)
    take_in(raw, review.settings, answers)
    return {row: answers.newly_bound.get(item.key, "") for (row, _), item in asked.items()}


def _append(path: Path, lines: list[list[str]]) -> None:
    """Add lines in the order of the file's own header; further columns of the team's stay."""
    from drystone.sheet.answers import COLUMNS, read_answers
    from drystone.sheet.headers import plain
    from drystone.sheet.present import harmless
    from drystone.sheet.read_csv import csv_grid

    if path.exists():
        read_answers(path)  # refuses a file that could not be read back
        grid = [list(row) for row in csv_grid(path)[0]]
    else:
        grid = [list(COLUMNS)]
    top = next(i for i, row in enumerate(grid) if any(cell.strip() for cell in row))
    ours = {plain(name): name for name in COLUMNS}
    header = [ours.get(plain(cell), "") for cell in grid[top]]
    missing = [name for name in COLUMNS if name not in header]
    grid[top] += missing
    header += missing
    for line in lines:
        values = dict(zip(COLUMNS, map(harmless, line), strict=True))
        grid.append([values.get(name, "") for name in header])
    stream = io.StringIO()
    csv.writer(stream, lineterminator="\n").writerows(grid)
    write_text(path, stream.getvalue())
