"""Results that are missing or impossible break neither the page nor the figures."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path

import pandas as pd
import pytest
from report.invented_facts import invented_facts
from test_report_numbers import plain

from drystone.report.facts import AnalysisFacts, ReportFacts, main_model, main_strategy
from drystone.report.figures import figure_specs, save_figures
from drystone.report.ladder import build_ladder
from drystone.report.links import Links
from drystone.report.page import render_page
from drystone.report.study_summary import summarise_studies

# V = [[1, 2], [2, 1]] has the eigenvalues 3 and -1: no two rows could have it
IMPOSSIBLE = pd.DataFrame(
    {
        "row_id": ["a", "b", "c"],
        "study": ["s", "s", "t"],
        "effect": [0.1, 0.3, 0.2],
        "sampling_variance": [1.0, 1.0, 1.0],
    }
)
TOO_MUCH = pd.DataFrame({"row_id": ["a"], "other_row_id": ["b"], "covariance": [2.0]})


def test_an_indefinite_covariance_leaves_the_study_blank() -> None:
    first, second = summarise_studies(IMPOSSIBLE, TOO_MUCH, 0.0)
    assert math.isnan(first.mean)
    assert math.isnan(first.se)
    assert (second.mean, second.se) == (0.2, 1.0)


@pytest.mark.parametrize("variance", [-1.0, 0.0, math.nan])
def test_a_variance_that_cannot_be_leaves_the_study_blank(variance: float) -> None:
    rows = IMPOSSIBLE.assign(sampling_variance=[1.0, 1.0, variance])
    summary = summarise_studies(rows, TOO_MUCH.iloc[:0], 0.0)[1]
    assert math.isnan(summary.mean)
    assert math.isnan(summary.se)


def test_a_variance_between_rows_can_make_it_possible_again() -> None:
    # [[1 + 2, 2], [2, 1 + 2]] has the eigenvalues 5 and 1; the mean's variance is 5 / 2
    first = summarise_studies(IMPOSSIBLE, TOO_MUCH, 2.0)[0]
    assert first.mean == pytest.approx(0.2, rel=1e-12)
    assert first.se == pytest.approx(math.sqrt(2.5), rel=1e-12)


def indefinite(facts: ReportFacts) -> ReportFacts:
    """Facts whose first study has an impossible covariance, and its second a negative variance."""
    analysis = facts.analyses[0]
    main = main_strategy(facts, analysis)
    sampling = main.sampling.copy()
    first, second = sampling["study"].unique()[:2]
    rows = sampling.index[sampling["study"] == first]
    sampling.loc[sampling.index[sampling["study"] == second], "sampling_variance"] = -0.5
    pair = pd.DataFrame(
        {
            "row_id": [sampling.loc[rows[0], "row_id"]],
            "other_row_id": [sampling.loc[rows[1], "row_id"]],
            "covariance": [50.0],
        }
    )
    changed = replace(main, sampling=sampling, covariance=pair)
    made = tuple(changed if s.name == main.name else s for s in analysis.strategies)
    return replace(facts, analyses=(replace(analysis, strategies=made), *facts.analyses[1:]))


def test_page_and_figures_stand_an_indefinite_covariance(tmp_path: Path) -> None:
    facts = indefinite(invented_facts(12))
    analysis = facts.analyses[0]
    main = main_strategy(facts, analysis)
    ladder = build_ladder(facts, analysis, main, main_model(main), Links({}, {}))
    assert [study.bar is None for study in ladder.studies[-2:]] == [True, True]
    assert ladder.without_bar == 2
    page = plain(render_page(facts))
    assert "2 studies have no bar: the sampling covariance of the rows is one that no" in page
    one = figure_specs(facts)["beetles studies"]
    values = json.loads(json.dumps(one, allow_nan=False))["data"]["values"]
    assert [value["estimate"] for value in values[-2:]] == [None, None]
    assert values[-1]["beyond"] == "n/a"
    save_figures(replace(facts, analyses=(analysis,)), tmp_path)
    assert (tmp_path / "beetles studies.svg").stat().st_size > 0


def all_refused(analysis: AnalysisFacts) -> AnalysisFacts:
    """Analysis in which every strategy and model is refused and no row is left."""
    refused = next(m for s in analysis.strategies for m in s.models if m.refused)
    made = tuple(
        replace(
            s,
            sampling=s.sampling.iloc[:0],
            covariance=s.covariance.iloc[:0],
            averages=s.averages.iloc[:0],
            models=tuple(replace(refused, name=m.name, formula=m.formula) for m in s.models),
        )
        for s in analysis.strategies
    )
    table = analysis.side_by_side.copy()
    table["refused"] = refused.refused
    table[["estimate", "ci_low", "ci_high"]] = math.nan
    nothing = {"slice": analysis.slice.iloc[:0], "effects": analysis.effects.iloc[:0]}
    return replace(analysis, strategies=made, side_by_side=table, **nothing)


def test_page_and_figures_stand_a_review_without_any_result(tmp_path: Path) -> None:
    facts = invented_facts(12, refuse_main=True, analyses=1)
    facts = replace(facts, analyses=(all_refused(facts.analyses[0]),))
    page = plain(render_page(facts))
    assert "No strategy gave an overall effect." in page
    assert "was refused under every strategy" in page
    save_figures(facts, tmp_path)
    assert {path.suffix for path in tmp_path.iterdir()} == {".svg", ".pdf", ".png"}
