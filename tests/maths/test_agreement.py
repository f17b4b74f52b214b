"""Kappa: worked by hand and by its limits."""

import numpy as np
import pytest

from drystone.maths.agreement import cohen_kappa


def codes(table):
    """Codes of two people from a table of counts, first person's category by row."""
    pairs = [(i, j) for i, row in enumerate(table) for j, n in enumerate(row) for _ in range(n)]
    return (np.array([pair[k] for pair in pairs], dtype=np.int64) for k in (0, 1))


def test_by_hand():
    # 50 things; agreement 35/50 = .7; by chance (25 x 30 + 25 x 20)/2500 = .5; (.7 - .5)/.5 = .4
    assert cohen_kappa(*codes([[20, 5], [10, 15]])) == pytest.approx(0.4, rel=1e-12)


def test_limits():
    assert cohen_kappa(*codes([[7, 0, 0], [0, 4, 0], [0, 0, 2]])) == pytest.approx(1, rel=1e-12)
    # independent: 6/12 x 4/12 and so on, so observed and chance agreement are the same
    assert cohen_kappa(*codes([[2, 4], [2, 4]])) == pytest.approx(0, abs=1e-12)
    assert np.isnan(cohen_kappa(*codes([[5]])))
    assert np.isnan(cohen_kappa(*codes([])))


def test_against_the_definition_by_counting_pairs():
    """Slow twin: chance agreement as the share of equal pairs among all pairs of both lists."""
    random = np.random.default_rng(11)
    for _ in range(20):
        a, b = random.integers(0, 4, 30), random.integers(0, 4, 30)
        chance = np.mean([x == y for x in a for y in b])
        expected = (np.mean(a == b) - chance) / (1 - chance)
        assert cohen_kappa(a, b) == pytest.approx(expected, rel=1e-12)
