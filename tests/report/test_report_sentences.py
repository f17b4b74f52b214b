"""Sentences about direction, prediction, sign and filters. Invented numbers."""

from __future__ import annotations

import pytest
from test_report_numbers import plain

from drystone.report import sentences


@pytest.mark.parametrize(
    ("low", "high", "part"),
    [(0.1, 0.2, "wholly above zero"), (-0.2, -0.1, "wholly below zero"), (-0.1, 0.2, "includes")],
)
def test_direction(low: float, high: float, part: str) -> None:
    assert part in sentences.direction((low + high) / 2, low, high, 95.0)


def test_turned_signs_are_explained() -> None:
    assert "less of the outcome" in sentences.ratio_meaning(5, 5)
    assert "in 2 rows of 5" in plain(sentences.ratio_meaning(2, 5))
    assert "more of the outcome" in sentences.ratio_meaning(0, 5)


def test_filters_in_words() -> None:
    text = sentences.filters({"site": ("North", "South")}, {"crop": ("rye",)})
    assert text == "Only rows where site is North or South and crop is not rye."
    assert sentences.filters({}, {}) == ""


def test_the_prediction_is_about_a_true_ratio() -> None:
    # 100 (exp(-0.1) - 1) = -9.5, 100 (exp(0.2) - 1) = 22.1
    assert plain(sentences.prediction(-0.1, 0.2, 95.0)) == (
        "Prediction interval, 95 %: the true ratio of a new comparison in a new study (without its "
        "sampling error) is expected between -9.5 % and +22 %."
    )
