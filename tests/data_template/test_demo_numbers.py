"""The process behind the demo's numbers: printed spreads, and the true values that it claims."""

import math
from statistics import fmean, stdev

import demo_numbers as numbers
import demo_places as places
import pytest

FORAGE = places.OUTCOMES[places.FORAGE]


@pytest.mark.parametrize(
    ("kind", "cells"),
    [
        ("none", {}),
        ("SD", {"control_sd": 2.0}),
        ("SE", {"control_spread": 1.0, "control_spread_kind": "SE"}),  # 2 / sqrt(4)
        ("CV%", {"control_spread": 20.0, "control_spread_kind": "CV%"}),  # 100 * 2 / 10
        ("variance", {"control_spread": 4.0, "control_spread_kind": "variance"}),
        # t(3, .975) = 3.182 in any printed table; 10 -+ 3.182 * 2 / sqrt(4)
        ("CI", {"control_lower": 6.82, "control_upper": 13.18, "control_spread_kind": "CI"}),
    ],
)
def test_spread_is_printed_as_its_kind(kind, cells):
    printed = numbers._arm_cells("control", numbers.Arm(10.0, 2.0, 4), kind, FORAGE)
    assert printed == {"control_mean": 10.0, "control_n": 4, **cells}


def test_same_study_gives_the_same_rows_whatever_else_is_drawn():
    study = places.all_studies()[3]
    first = numbers.rows_of(study)
    numbers.rows_of(places.all_studies()[4])
    assert numbers.rows_of(study) == first


@pytest.mark.parametrize("outcome", list(places.OUTCOMES.values()), ids=lambda item: item.name)
def test_drawn_effects_scatter_around_the_stated_mean(outcome):
    # MONTE_CARLO: 4 standard errors, fixed streams. Wall heights are uniform on .8 to 2.1 m, so on
    # average .05 m above the middle height; the aspects balance, as each is as likely and their
    # effects sum to 0 for forage and to .02 for beetles.
    means = []
    for number in range(600):
        study = places.Study(f"test stream {number}", 2000, (outcome.name,))
        ratios = [math.log(r["treatment_mean"] / r["control_mean"]) for r in numbers.rows_of(study)]
        means.append(fmean(ratios))
    expected = outcome.mean_effect + 0.05 * outcome.per_metre + sum(outcome.by_aspect.values()) / 3
    assert abs(fmean(means) - expected) < 4 * stdev(means) / math.sqrt(len(means))
    # the tolerance can tell the stated mean from that of the other outcome (.13 apart)
    assert 4 * stdev(means) / math.sqrt(len(means)) < 0.065


def test_true_variation_stays_in_the_stated_range():
    draws = numbers.Draws("test of variation")
    arms = [numbers._arm(5.0, 2_000, FORAGE, draws) for _ in range(40)]
    low, high = FORAGE.cv
    # sampling error of a CV from 2 000 log-normal values is below 3 % of it here
    assert all(0.9 * low < arm.sd / arm.mean < 1.1 * high for arm in arms)
