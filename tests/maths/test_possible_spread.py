"""Largest SDs, and means and SDs that whole numbers cannot have."""

import itertools
import math
import statistics

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from drystone.maths.possible_spread import largest_sd, squares_behind, sums_behind

ALGEBRA = 1e-12


def test_largest_sd_on_a_scale():
    # sd.max_bounded of tests/reference/checks.json: sqrt(12 x 88 x 5 / 4)
    assert largest_sd(12.0, 5.0, 0.0, 100.0) == pytest.approx(36.3318042491699, rel=ALGEBRA)


def test_largest_sd_of_values_from_zero_up():
    # sd.max_nonneg of tests/reference/checks.json: one value is 8, three are 0
    assert largest_sd(2.0, 4.0, 0.0, math.inf) == pytest.approx(4.0, rel=ALGEBRA)
    assert statistics.stdev([0, 0, 0, 8]) == pytest.approx(4.0, rel=ALGEBRA)


def test_no_largest_sd_of_one_value_or_outside_the_scale():
    assert np.isnan(largest_sd([2.0, 120.0], [1.0, 5.0], 0.0, 100.0)).all()


@given(st.lists(st.integers(0, 7), min_size=2, max_size=12))
def test_no_values_beat_the_largest_sd(values):
    mean, sd = statistics.fmean(values), statistics.stdev(values)
    assert sd <= largest_sd(mean, len(values), 0.0, 7.0) + 1e-9
    assert sd <= largest_sd(mean, len(values), 0.0, math.inf) + 1e-9


@pytest.mark.parametrize(
    ("mean", "n"),
    [
        (5.19, 28),  # Brown and Heathers 2017, opening example (memory): 145/28 and 146/28 round
        (3.48, 20),  # grim.die of the formula sheet: 20 rolls of a die
    ],
)
def test_published_impossible_means(mean, n):
    assert sums_behind(mean, 0.005, n) == []


def test_sums_and_squares_of_the_formula_sheet():
    # grimmer of tests/reference/checks.json
    assert squares_behind(3.45, 0.005, 1.19, 0.005, 20) == [(69, 265)]
    assert squares_behind(3.45, 0.005, 1.16, 0.005, 20) == []


@given(st.lists(st.integers(0, 40), min_size=2, max_size=30))
def test_real_whole_numbers_are_never_called_impossible(values):
    mean, sd = round(statistics.fmean(values), 2), round(statistics.stdev(values), 2)
    found = squares_behind(mean, 0.005, sd, 0.005, len(values))
    true = sum(values), sum(v * v for v in values)
    assert true in found or len(found) > 10  # long lists are cut


def test_all_sets_of_three_dice_are_possible_and_nothing_else_is():
    # by counting: every mean of three dice, printed with two decimals, and no other such number
    printed = {round(sum(d) / 3, 2) for d in itertools.product(range(1, 7), repeat=3)}
    for cents in range(100, 601):
        assert bool(sums_behind(cents / 100, 0.005, 3)) == (cents / 100 in printed)
