"""What the check left behind: findings by kind, the ledger, the derivations."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import pandas as pd

from drystone.report import numbers
from drystone.report.facts import Record, ReportFacts, records
from drystone.report.links import Links
from drystone.report.tables_shown import Cell, Row, Shown, row, shown
from drystone.words import levels

LEVEL_WORDS = {
    levels.STOP: "cannot be used",
    levels.ASK: "waits for a person",
    levels.WARN: "worth a look",
    levels.FIXED: "converted",
}


@dataclass(frozen=True)
class Group:
    """Findings, or ledger entries, of one kind."""

    title: str
    level: str
    level_words: str
    count: int
    first: str
    table: Shown


def finding_groups(facts: ReportFacts, links: Links) -> tuple[Group, ...]:
    """Findings by level and rule, the gravest level first."""
    return tuple(_findings(facts.findings, links))


def _findings(findings: pd.DataFrame, links: Links) -> Iterator[Group]:
    heads = ("Where", "Row", "Column", "As typed", "What is wrong", "What to do")
    for level in levels.LEVELS:
        same = findings[findings["level"] == level]
        for rule, part in same.groupby("rule", sort=False):
            rows = [_finding(item, links) for item in records(part)]
            caption = f"{rule}: {numbers.count(len(part), 'finding')}"
            first = str(part["wrong"].iloc[0])
            yield Group(
                str(rule), level, LEVEL_WORDS[level], len(part), first, shown(caption, heads, rows)
            )


def _finding(item: Record, links: Links) -> Row:
    where = " ".join(numbers.typed(item[name]) for name in ("sheet", "cell")).strip()
    texts = (numbers.typed(item[name]) for name in ("column", "value", "wrong", "todo"))
    return row((where, _row_cell(item["row_id"], links), *texts))


def ledger_groups(facts: ReportFacts, links: Links) -> tuple[Group, ...]:
    """Ledger entries by rule, most rows first."""
    heads = ("Row", "Study", "Where", "Reason", "Analysis", "Strategy", "Model")
    found = []
    for rule, part in facts.ledger.groupby("rule", sort=False):
        rows = [_entry(item, links) for item in records(part)]
        caption = f"{rule}: {numbers.count(len(part), 'entry', 'entries')}"
        first = str(part["reason"].iloc[0])
        found.append(Group(str(rule), "", "", len(part), first, shown(caption, heads, rows)))
    return tuple(sorted(found, key=lambda group: -group.count))


def _entry(item: Record, links: Links) -> Row:
    reach = [numbers.typed(item[name]) or "every" for name in ("analysis", "strategy", "model")]
    sheet_row = item["sheet_row"]
    where = numbers.typed(item["sheet"])
    if sheet_row == sheet_row and sheet_row:
        where = f"{where}, row {sheet_row:.0f}".lstrip(", ")
    texts = (numbers.typed(item["study"]), where, str(item["reason"]), *reach)
    return row((_row_cell(item["row_id"], links), *texts))


def derivation_table(facts: ReportFacts, links: Links) -> Shown:
    """Every SD that was computed from something else or read from another row."""
    heads = ("Row", "Study", "Arm", "#SD", "Rule", "From", "Assumed")
    rows = [
        row(
            (
                _row_cell(item["row_id"], links),
                numbers.typed(item["study"]),
                str(item["arm"]),
                numbers.number(item["sd"], 4),
                str(item["rule"]),
                str(item["inputs"]),
                str(item["assumptions"]),
            ),
            anchor=f"derivation-{position}",
        )
        for position, item in enumerate(records(facts.derivations), start=1)
    ]
    return shown("SDs that were computed from another spread or read from another row", heads, rows)


def _row_cell(row_id: object, links: Links) -> Cell:
    text = numbers.typed(row_id)
    place = links.first(text) if text else ""
    return Cell(text, f"#{place}" if place else "")
