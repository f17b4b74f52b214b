"""Places on the page, so that every number leads to its rows and every row to its cells.

Ids are made from positions, never from names: a study may be called anything.
"""

from __future__ import annotations

from dataclasses import dataclass

from drystone.report.facts import AnalysisFacts, ReportFacts


@dataclass(frozen=True)
class Links:
    """Where rows and derivations stand.

    Parameters
    ----------
    rows : row_id -> id, for each analysis by its name
    derivations : row_id -> (arm, id) of each SD that was computed
    """

    rows: dict[str, dict[str, str]]
    derivations: dict[str, list[tuple[str, str]]]

    def of(self, analysis: AnalysisFacts) -> dict[str, str]:
        """Places of the rows of ``analysis``."""
        return self.rows.get(analysis.name, {})

    def first(self, row_id: object) -> str:
        """Place of a row in the first analysis that holds it; blank when it is in none."""
        return next((rows[str(row_id)] for rows in self.rows.values() if str(row_id) in rows), "")


def build_links(facts: ReportFacts, shown: dict[str, set[str]]) -> Links:
    """Links of a page; ``shown`` says which rows each analysis prints."""
    rows = {
        analysis.name: {
            str(row): f"analysis-{number}-row-{position}"
            for position, row in enumerate(analysis.slice["row_id"], start=1)
            if row in shown[analysis.name]
        }
        for number, analysis in enumerate(facts.analyses, start=1)
    }
    derivations: dict[str, list[tuple[str, str]]] = {}
    pairs = zip(facts.derivations["row_id"], facts.derivations["arm"], strict=True)
    for position, (row, arm) in enumerate(pairs, start=1):
        derivations.setdefault(str(row), []).append((str(arm), f"derivation-{position}"))
    return Links(rows, derivations)
