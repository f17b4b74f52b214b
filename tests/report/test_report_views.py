"""Counts, scale, study summaries and pictures behind the page."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pandas as pd
import pytest
from report.invented_facts import invented_facts

from drystone.report import flow
from drystone.report.facts import main_model, main_strategy
from drystone.report.gaps import gap_counts, gap_studies
from drystone.report.ladder import build_ladder
from drystone.report.links import Links
from drystone.report.scale import RatioScale, ratio_scale
from drystone.report.spread import spread_pictures
from drystone.report.study_summary import summarise_studies

ALGEBRA = 1e-12


def test_counts_add_up_for_every_strategy() -> None:
    facts = invented_facts(40)
    for analysis in facts.analyses:
        for strategy in analysis.strategies:
            found = flow.row_flow(facts, analysis, strategy)
            assert found.adds_up, found
            assert found.check.startswith("The counts add up")
            assert found.rows_in == found.elsewhere + found.gone + found.used


def test_a_row_that_vanished_is_said() -> None:
    facts = invented_facts(40)
    analysis = facts.analyses[0]
    wrong = replace(facts, flow=replace(facts.flow, rows_in=facts.flow.rows_in + 1))
    found = flow.row_flow(wrong, analysis, analysis.strategies[0])
    assert not found.adds_up
    assert "do not add up" in found.check


def test_a_row_with_two_entries_leaves_once() -> None:
    facts = invented_facts(20)
    first = facts.ledger.iloc[[0]].assign(rule="another rule")
    doubled = replace(facts, ledger=pd.concat([facts.ledger, first], ignore_index=True))
    analysis = facts.analyses[0]
    assert flow.row_flow(doubled, analysis, main_strategy(facts, analysis)).adds_up


def test_scale_places_ends_and_middle() -> None:
    scale = RatioScale(-1.0, 1.0)
    assert [scale.at(x) for x in (-1.0, 0.0, 1.0, 5.0)] == [0.0, 50.0, 100.0, 100.0]
    bar = scale.bar(2.0, -3.0, 4.0)
    assert bar is not None
    assert (bar.cut_low, bar.cut_high, bar.inside) == (True, True, False)
    assert scale.bar(math.nan, 0, 1) is None


@pytest.mark.parametrize("reach", [0.01, 0.1, 1.0, 4.0])
def test_ticks_hold_zero_and_do_not_touch(reach: float) -> None:
    ticks = RatioScale(-reach, reach).ticks()
    assert sum(tick.is_zero for tick in ticks) == 1
    assert len(ticks) >= 3
    assert min(np.diff([tick.at for tick in ticks])) >= 9.0 - 0.02


def test_one_odd_row_does_not_flatten_the_scale() -> None:
    many = list(np.linspace(-0.5, 0.5, 101))
    assert ratio_scale([*many, 40.0], []).high < 1.0
    assert ratio_scale(many, [2.0]).high > 2.0


def test_study_summary_by_hand() -> None:
    # two rows, effects 0 and 1, variances 1 + 1 and 3 + 1 with covariance 1:
    # inverse of [[2, 1], [1, 4]] is [[4, -1], [-1, 2]] / 7; weights 3/7 and 1/7; mean 1/4; var 7/4
    sampling = pd.DataFrame(
        {
            "row_id": ["a", "b", "c"],
            "study": ["s", "s", "t"],
            "effect": [0.0, 1.0, 0.5],
            "sampling_variance": [1.0, 3.0, 3.0],
        }
    )
    covariance = pd.DataFrame({"row_id": ["b"], "other_row_id": ["a"], "covariance": [1.0]})
    first, second = summarise_studies(sampling, covariance, 1.0)
    assert (first.study, first.rows) == ("s", 2)
    assert first.mean == pytest.approx(0.25, rel=ALGEBRA)
    assert first.se == pytest.approx(math.sqrt(1.75), rel=ALGEBRA)
    assert (second.mean, second.se) == (pytest.approx(0.5), pytest.approx(2.0, rel=ALGEBRA))


def test_ladder_holds_every_row_of_the_strategy() -> None:
    facts = invented_facts(130)
    analysis = facts.analyses[0]
    for strategy in analysis.strategies:
        ladder = build_ladder(facts, analysis, strategy, main_model(strategy), Links({}, {}))
        shown = {row.row_id for study in ladder.studies for row in study.rows}
        assert shown == set(strategy.sampling["row_id"])
        effects = [study.effect for study in ladder.studies]
        assert effects == sorted(effects, reverse=True)


def test_gaps_count_each_physical_arm_once() -> None:
    table = invented_facts(12).analyses[0].slice
    control = gap_counts(table)[0]
    # rows 1 and 2 of the invented slice share their control
    shared = table["study"].iloc[0] == table["study"].iloc[1]
    assert control.arms == len(table) - int(shared)
    no_years = pd.DataFrame({"study": [], "year": []})
    cells = [cell for study in gap_studies(table, no_years, {}) for cell in study.cells]
    assert len(cells) == len(table)
    missing = sum(cell.treatment == "none" for cell in cells)
    assert missing == table["treatment_sd"].isna().sum()


def test_lines_of_equal_cv_pass_through_their_points() -> None:
    picture = spread_pictures(invented_facts(130).analyses[0].slice)[0]
    line = next(line for line in picture.lines if line.label == "CV 0.3")
    slope = (line.y2 - line.y1) / (line.x2 - line.x1)
    for point in picture.points:
        above = point.y < line.y1 + slope * (point.x - line.x1)
        if abs(point.sd / point.mean - 0.3) > 0.01:
            assert above == (point.sd / point.mean > 0.3)
