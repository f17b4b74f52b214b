"""What ``drystone check`` does: prints the findings, writes them as CSV, marks a copy."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from drystone.driving.filters import idle_filters
from drystone.driving.plan import Plan, make_plan
from drystone.driving.session import shown_path
from drystone.words.levels import STOP

FINDINGS_FILE = Path("results") / "check" / "findings.csv"
ACCEPTED_FILE = Path("results") / "check" / "accepted.csv"


def check_review(folder: Path, say: Callable[[str], None]) -> bool:
    """Print what the check found in the review in ``folder``; True when a row cannot be used.

    Raises
    ------
    ConfigProblem, SheetProblem
        When config or sheet cannot be used at all.
    """
    from drystone.sheet.present import collapse, findings_csv

    plan = make_plan(folder.resolve())
    _ = plan.keys  # refuses formulas and filters that name a column which the sheet lacks
    findings = plan.state.table("findings")
    for line in collapse(findings):
        say(str(line))
    for text in _accepted(plan):
        say(text)
    for note in idle_filters(plan):
        say(note)
    say(_count(plan))
    target = plan.review.root / FINDINGS_FILE
    findings_csv(findings, target)
    _write_accepted(plan)
    say(f"All findings with their cells: {shown_path(target)}")
    say(_mark(plan))
    plan.state.remember()
    return bool((findings["level"] == STOP).any())


def _mark(plan: Plan) -> str:
    """Write the marked copy; say where it is."""
    from drystone.sheet.marked_copy.target import copy_name, put
    from drystone.sheet.marked_copy.write import write_marked_copy
    from drystone.stages.intake_store import load_columns

    sheet, root = plan.review.sheet_path(), plan.review.root
    findings, rows = plan.state.table("findings"), plan.state.table("rows")
    columns = load_columns(plan.state.folder)
    made = put(
        lambda path: write_marked_copy(sheet, findings, rows, columns, path),
        root / FINDINGS_FILE.parent,
        sheet,
    )
    said = f"Your sheet with the doubtful cells marked: {shown_path(made)}"
    if made.name != copy_name(sheet):
        said += f" ({copy_name(sheet)} is open in another program, so it was left alone)"
    return said


def _write_accepted(plan: Plan) -> None:
    from drystone.sheet.present import findings_csv

    accepted, target = plan.state.table("accepted"), plan.review.root / ACCEPTED_FILE
    if len(accepted) or target.exists():
        findings_csv(accepted, target)


def _accepted(plan: Plan) -> list[str]:
    """One line for the findings of each kind that people accepted, with the first reason."""
    accepted = plan.state.table("accepted")
    lines = []
    for (level, rule), group in accepted.fillna("").groupby(["level", "rule"], sort=False):
        first = group.iloc[0]
        times = f", {len(group)} times" if len(group) > 1 else ""
        by = f" ({first['who']})" if first["who"] else ""
        reason = first["reason"] or "no reason given"
        lines.append(f"accepted: {rule} ({level}){times}: {reason}{by}")
    return lines


def _count(plan: Plan) -> str:
    rows, ledger = plan.state.table("rows"), plan.state.table("ledger")
    if rows.empty:
        return (
            f"The sheet has no rows yet; type your comparisons into {plan.review.settings.sheet}."
        )
    usable = len(rows) - len(ledger.drop_duplicates(["sheet", "sheet_row"]))
    return f"{len(rows)} rows: {usable} usable, {len(rows) - usable} in the ledger."
