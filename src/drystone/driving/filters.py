"""Filters of the config that no row of the sheet answers to: most often a typing error."""

from __future__ import annotations

from typing import TYPE_CHECKING

from drystone.driving.fingerprint import digest
from drystone.driving.plan import Plan
from drystone.settings.problems import nearest

if TYPE_CHECKING:
    from drystone.settings.model import Analysis


def idle_filters(plan: Plan) -> list[str]:
    """A sentence for each value of a filter that no row has."""
    analyses = plan.review.settings.all_analyses()
    asked = {name: [item.where, item.where_not] for name, item in analyses.items()}
    if not any(any(parts) for parts in asked.values()):
        return []
    found: list[str] = plan.state.remembered(
        f"idle filters {digest(asked)}",
        lambda: [text for name, item in analyses.items() for text in _idle(plan, name, item)],
    )
    return found


def _idle(plan: Plan, name: str, analysis: Analysis) -> list[str]:
    from drystone.stages.slice_rows import as_text

    rows = plan.state.table("rows")
    rows = rows[rows["outcome"].isin(analysis.outcome)]
    found = []
    for word, filters in (("where", analysis.where), ("where_not", analysis.where_not)):
        for column, values in filters.items():
            known = sorted(set(as_text(rows[column])) - {""})
            found += [
                f"analysis '{name}', {word}: no row has {column} '{value}'; {nearest(value, known)}"
                for value in values
                if value not in known
            ]
    return found
