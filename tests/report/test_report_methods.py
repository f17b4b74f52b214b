"""Methods in words: what the run did, and nothing that it did not. Invented facts."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import replace

import pandas as pd
import pytest
from report.invented_facts import invented_facts
from test_report_numbers import plain

from drystone.report.facts import MadeFrom, ReportFacts
from drystone.report.links import Links
from drystone.report.methods import methods
from drystone.report.page import render_page
from drystone.report.references import references
from drystone.report.sure import sure
from drystone.report.why import why


def paragraphs(facts: ReportFacts) -> dict[str, str]:
    return {piece.heading: plain(piece.text) for piece in methods(facts)}


def with_settings(facts: ReportFacts, **changes: object) -> ReportFacts:
    return replace(facts, settings=facts.settings.model_copy(update=changes))


def with_inference(facts: ReportFacts, **changes: object) -> ReportFacts:
    return with_settings(facts, inference=facts.settings.inference.model_copy(update=changes))


def with_analysis(facts: ReportFacts, number: int, changes: Mapping[str, object]) -> ReportFacts:
    made = list(facts.analyses)
    settings = made[number].settings.model_copy(update=dict(changes))
    made[number] = replace(made[number], settings=settings)
    return replace(facts, analyses=tuple(made))


def test_methods_follow_the_settings() -> None:
    facts = invented_facts(12)
    text = " ".join(piece.text for piece in methods(facts))
    for part in ("second-order", "first order", "restricted maximum", "per physical arm", "CR2"):
        assert part in text
    assert sum(piece.person for piece in methods(facts)) == 5
    assert any("2015" in entry for entry in references(facts))


def test_versions_stand_in_the_methods() -> None:
    facts = replace(invented_facts(12), made_from=MadeFrom("r", {"Thing": "9.9"}))
    assert any("Thing 9.9" in piece.text for piece in methods(facts))


MODEL_BASED = "model-based standard error"


def test_model_based_intervals_stand_alone() -> None:
    facts = with_inference(invented_facts(130), interval="model based")
    text = paragraphs(facts)["Intervals and tests"]
    assert MODEL_BASED in text
    assert "CR2" not in text
    assert "Beside them" not in text
    shown = sure(facts, facts.analyses[0])
    assert shown is not None
    assert not shown.two_kinds
    assert all(not side.beside and side.bar_beside is None for side in shown.sides)
    tables = why(facts, facts.analyses[0], Links({}, {})).moderators
    assert not any("Model-based" in head for table in tables for head in table.heads)
    page = render_page(facts)
    assert page.count("Bar: model-based interval.") == 2
    assert "Thin pale bar below" not in page
    assert "Model-based interval" not in page


def test_robust_intervals_have_the_other_kind_beside_them() -> None:
    facts = invented_facts(130)
    assert (
        "Beside them stand intervals from the " + MODEL_BASED
        in (paragraphs(facts)["Intervals and tests"])
    )
    page = render_page(facts)
    assert page.count("Dark bar: main interval (cluster-robust)") == 2


def test_what_happened_to_spreads_is_counted() -> None:
    facts = invented_facts(12)
    one = facts.derivations.iloc[[0]].assign(rule="read from another row", row_id="beetles-0012")
    both = replace(facts, derivations=pd.concat([facts.derivations, one], ignore_index=True))
    assert (
        "6 SDs were computed from a spread that was reported as something else. 1 blank SD was "
        "read from another row in which the same physical arm reports one. Each is listed under "
        "Derivations."
    ) in paragraphs(both)["Rows"]
    assert "another row" not in paragraphs(facts)["Rows"]
    none = replace(facts, derivations=facts.derivations.iloc[:0])
    assert "Derivations" not in paragraphs(none)["Rows"]
    assert "computed" not in paragraphs(none)["Rows"]


def test_averages_are_pooled_over_outcomes_only() -> None:
    text = paragraphs(invented_facts(12))["Averages"]
    assert "fewer than ten reporting arms is pooled over the outcomes of its analysis" in text
    assert "never over control and treatment arms" in text
    assert "with one outcome it stays as it is" in text
    assert "takes one CV, that of the role in which it stands in more rows" in text
    assert "could not be taken" not in text


@pytest.mark.parametrize(
    ("because", "words"),
    [
        ("no control arm reports", "beetles an average by arm could not be taken and is over both "
         "arms: no control arm reports."),
        (None, "is over both arms: most SDs are one value for both arms."),
    ],
)  # fmt: skip
def test_an_average_by_arm_that_was_over_both_is_said(because: str | None, words: str) -> None:
    facts = invented_facts(12)
    made = tuple(
        replace(s, averages=s.averages.assign(arm="both", pooled_because=because))
        for s in facts.analyses[0].strategies
    )
    facts = replace(facts, analyses=(replace(facts.analyses[0], strategies=made),))
    assert words in paragraphs(facts)["Averages"]


def test_averages_over_both_arms_speak_of_no_roles() -> None:
    facts = invented_facts(12)
    both = tuple(
        s.model_copy(update={"average_over": "both arms"}) for s in facts.settings.strategies
    )
    assert "role" not in paragraphs(with_settings(facts, strategies=both))["Averages"]


def test_main_strategy_and_who_declared_it() -> None:
    facts = invented_facts(12)
    assert paragraphs(facts)["Main strategy"].startswith(
        "'all cases' is the main strategy, declared as primary in the config"
    )
    fields = {
        name: getattr(facts.settings, name)
        for name in facts.settings.model_fields_set - {"primary"}
    }
    silent = replace(facts, settings=type(facts.settings).model_construct(**fields))
    assert "by default" in paragraphs(silent)["Main strategy"]


def test_partner_on_complete_rows_says_where_its_average_comes_from() -> None:
    text = paragraphs(invented_facts(12))["Strategy: all cases on complete rows"]
    assert "that of all reporting arms of the analysis, those of the other rows included" in text
    assert "Not declared in the config" in text
    assert "Not declared" not in paragraphs(invented_facts(12))["Strategy: all cases"]


def test_covariance_of_shared_arms_has_two_signs() -> None:
    facts = invented_facts(12)
    text = paragraphs(facts)["Shared arms"]
    assert "negative in a chain, where the treatment of one row is the control of the other" in text
    assert "in second order" in text
    first = replace(facts, analyses=facts.analyses[1:])
    assert "second order" not in paragraphs(first)["Shared arms"]


def test_likelihoods_are_compared_in_words_under_reml_only() -> None:
    facts = invented_facts(12)
    assert "REML values of models with different moderators" in paragraphs(facts)["Model"]
    assert "REML" not in paragraphs(with_inference(facts, estimator="ML"))["Model"]


def test_components_are_named_by_analysis() -> None:
    facts = invented_facts(12)
    assert "component for study and row, fitted" in paragraphs(facts)["Model"]
    unlike = with_analysis(facts, 1, {"levels": ("row",)})
    assert (
        "component for study and row in beetles; row in seeds, fitted"
        in (paragraphs(unlike)["Model"])
    )


def test_bars_of_studies_say_their_reference() -> None:
    facts = invented_facts(12)
    # normal quantiles: 1.95996 at 0.975 and 1.64485 at 0.95
    part = "plus and minus 1.96 standard errors (normal distribution, not t)"
    assert part in paragraphs(facts)["Intervals and tests"]
    assert part in plain(render_page(facts))
    narrower = with_inference(facts, confidence_percent=90.0)
    assert "plus and minus 1.64 standard errors" in plain(render_page(narrower))


def test_measures_are_defined_with_their_sources() -> None:
    facts = invented_facts(12)
    text = " ".join(paragraphs(facts).values())
    for part in (
        "Higgins & Thompson (2002)",
        "Nakagawa & Santos 2012",
        "CVH is the SD of true effects",
        "Yang et al. 2025",
        "Nakagawa & Schielzeth 2013",
        "100 (exp(x) - 1)",
        "below 3, a limit of common practice, no source",
        "No interval carries the uncertainty of the average CV itself",
    ):
        assert part in text
    listed = " ".join(references(facts))
    for part in ("21: 1539", "26: 1253", "10.1111/2041-210x.70155", "4: 133"):
        assert part in listed


def test_only_what_was_used_is_defined() -> None:
    facts = invented_facts(12)
    plain_only = tuple(
        replace(a, strategies=tuple(replace(s, models=s.models[:1]) for s in a.strategies))
        for a in facts.analyses
    )
    bare = replace(facts, analyses=plain_only)
    assert "R²" not in paragraphs(bare)["Heterogeneity"]
    assert not any("Schielzeth" in entry for entry in references(bare))


def test_blank_heterogeneity_has_a_reason() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    shown = sure(facts, analysis)
    assert shown is not None
    assert shown.blanks == ""
    main, *rest = analysis.strategies[1].models
    blank = replace(main, heterogeneity=main.heterogeneity.assign(q=float("nan")))
    second = replace(analysis.strategies[1], models=(blank, *rest))
    made = (analysis.strategies[0], second, *analysis.strategies[2:])
    changed = replace(analysis, strategies=made)
    shown = sure(facts, changed)
    assert shown is not None
    assert shown.blanks.startswith("Under missing cases, Q and I² are n/a: some rows are perfectly")
    assert "has no inverse" in render_page(replace(facts, analyses=(changed,)))
