"""The whole page: complete, closed to the outside, and safe with any name."""

from __future__ import annotations

import re
from dataclasses import replace
from html.parser import HTMLParser

import pytest
from report.invented_facts import HOSTILE, invented_facts

from drystone.report.facts import Flow
from drystone.report.page import render_page
from drystone.tables import check, results
from drystone.tables.store import empty_table

VOID = {"meta", "br", "link", "img", "input", "hr"}


class Outline(HTMLParser):
    """Tags in order, ids, links; checks that every tag is closed in order."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.tags: list[str] = []
        self.ids: list[str] = []
        self.links: list[str] = []
        self.handlers: list[str] = []
        self.text: list[str] = []
        self._open: list[str] = []
        self.feed(page)
        self.close()
        assert not self._open

    def handle_starttag(self, tag, attrs) -> None:
        self.tags.append(tag)
        self._note(attrs)
        if tag not in VOID:
            self._open.append(tag)

    def handle_startendtag(self, tag, attrs) -> None:
        self.tags.append(tag)
        self._note(attrs)

    def handle_endtag(self, tag) -> None:
        assert self._open.pop() == tag

    def handle_data(self, data) -> None:
        self.text.append(data)

    def _note(self, attrs) -> None:
        found = dict(attrs)
        self.ids += [found["id"]] if "id" in found else []
        self.links += [found[name] for name in ("href", "src") if name in found]
        self.handlers += [name for name in found if name.startswith("on")]


@pytest.fixture(scope="module")
def page() -> str:
    return render_page(invented_facts(130))


def test_page_is_well_formed_and_ids_are_unique(page: str) -> None:
    outline = Outline(page)
    assert len(outline.ids) == len(set(outline.ids))
    assert outline.tags.count("h1") == 1


def test_every_link_leads_to_a_place_on_the_page(page: str) -> None:
    outline = Outline(page)
    assert outline.links
    for link in outline.links:
        assert link.startswith("#")
        assert link[1:] in outline.ids


def test_sections_stand_in_order(page: str) -> None:
    order = ["found", "sure", "why", "findings", "ledger", "derivations", "methods", "cautions"]
    places = [page.index(f'<section id="{name}"') for name in order]
    assert places == sorted(places)


def test_nothing_is_fetched_and_nothing_runs(page: str) -> None:
    outline = Outline(page)
    assert not {"script", "link", "img", "iframe", "object", "embed", "form"} & set(outline.tags)
    assert not outline.handlers
    assert "default-src 'none'" in page
    style = page[page.index("<style>") : page.index("</style>")]
    assert not re.search(r"url\(|@import|https?:", style)


def test_every_row_is_on_the_page(page: str) -> None:
    for analysis in invented_facts(130).analyses:
        for row_id in analysis.slice["row_id"]:
            assert row_id in page


def test_hostile_names_stay_text() -> None:
    facts = invented_facts(40, hostile=True)
    hostile = render_page(replace(facts, review_name=HOSTILE[6]))
    outline = Outline(hostile)
    assert not {"script", "img"} & set(outline.tags)
    assert outline.tags.count("style") == 1
    assert not outline.handlers
    text = "".join(outline.text)
    for name in HOSTILE:
        assert name in text
    assert "{{ 7 * 7 }} {% raw %}" in hostile


def test_same_facts_give_the_same_page(page: str) -> None:
    assert render_page(invented_facts(130)) == page


def test_refused_main_model_is_said_on_the_first_screen() -> None:
    first = render_page(invented_facts(12, refuse_main=True)).split('<section id="sure"')[0]
    assert "No overall effect under all cases: one row for each study" in first
    assert not re.search(r"\bnan\b", first)


def test_no_not_a_number_on_the_page(page: str) -> None:
    assert not re.search(r"\bnan\b|\bNone\b|\binf\b", page)


def test_no_recommendation_to_act(page: str) -> None:
    text = "".join(Outline(page).text).lower()
    for word in ("recommend that", "should be applied", "we recommend", "farmers should"):
        assert word not in text
    assert "it recommends no action" in text


def test_empty_review_still_makes_a_page() -> None:
    facts = invented_facts(12)
    bare = replace(
        facts,
        analyses=(),
        findings=empty_table(check.FINDINGS),
        ledger=empty_table(check.LEDGER),
        derivations=empty_table(check.DERIVATIONS),
        flow=Flow(0, 0),
    )
    assert "The check found nothing to mend." in render_page(bare)


def test_an_analysis_without_overall_model_is_shown() -> None:
    facts = invented_facts(40)
    analysis = facts.analyses[0]
    only = tuple(replace(s, models=s.models[1:]) for s in analysis.strategies)
    table = analysis.side_by_side
    changed = replace(analysis, strategies=only, side_by_side=table[table["model"] != "overall"])
    page = render_page(replace(facts, analyses=(changed,)))
    assert "no model without moderators" in page


def test_a_strategy_with_nothing_left_is_shown() -> None:
    facts = invented_facts(40, refuse_main=True)
    analysis = facts.analyses[0]
    main = analysis.strategy("all cases")
    assert main is not None
    emptied = replace(main, sampling=main.sampling.iloc[:0], covariance=main.covariance.iloc[:0])
    strategies = tuple(emptied if s.name == main.name else s for s in analysis.strategies)
    page = render_page(replace(facts, analyses=(replace(analysis, strategies=strategies),)))
    assert "No overall effect" in page


def test_an_analysis_without_strategies_is_refused_in_words() -> None:
    facts = invented_facts(12)
    none = replace(facts.analyses[0], strategies=(), side_by_side=empty_table(results.SIDE_BY_SIDE))
    with pytest.raises(ValueError, match="has no strategy"):
        render_page(replace(facts, analyses=(none,)))
