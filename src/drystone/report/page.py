"""The page: facts in, one HTML text out, with no script and nothing fetched."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

from jinja2 import Environment, PackageLoader, StrictUndefined

from drystone.report import methods, numbers
from drystone.report.cautions import general_cautions, review_cautions
from drystone.report.checked import derivation_table, finding_groups, ledger_groups
from drystone.report.facts import AnalysisFacts, ReportFacts, main_strategy
from drystone.report.found import Found, found
from drystone.report.links import Links, build_links
from drystone.report.references import references
from drystone.report.sure import Sure, sure
from drystone.report.why import Why, why


@dataclass(frozen=True)
class AnalysisPage:
    """One analysis in the three sections."""

    anchor: str
    name: str
    found: Found
    sure: Sure | None
    why: Why


def render_page(facts: ReportFacts) -> str:
    """Report of a whole run as one self-contained HTML page.

    Raises
    ------
    ValueError
        When an analysis has no strategy.
    """
    links = build_links(facts, {a.name: _shown_rows(facts, a) for a in facts.analyses})
    return (
        _environment()
        .get_template("page.html.j2")
        .render(
            facts=facts,
            analyses=_analyses(facts, links),
            level=numbers.level_percent(facts.settings.inference.confidence_percent),
            review_cautions=review_cautions(facts),
            findings=finding_groups(facts, links),
            ledger=ledger_groups(facts, links),
            derivations=derivation_table(facts, links),
            methods=methods.methods(facts),
            references=references(facts),
            cautions=general_cautions(facts),
            person=methods.PERSON,
        )
    )


def _shown_rows(facts: ReportFacts, analysis: AnalysisFacts) -> set[str]:
    return set(main_strategy(facts, analysis).sampling["row_id"])


def _analyses(facts: ReportFacts, links: Links) -> list[AnalysisPage]:
    return [
        AnalysisPage(
            f"analysis-{number}",
            analysis.name,
            found(facts, analysis),
            sure(facts, analysis),
            why(facts, analysis, links),
        )
        for number, analysis in enumerate(facts.analyses, start=1)
    ]


@lru_cache(maxsize=1)
def _environment() -> Environment:
    environment = Environment(
        loader=PackageLoader("drystone.report"),
        autoescape=True,
        undefined=StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    environment.filters["count"] = numbers.count
    environment.globals["number"] = numbers.number
    return environment
