"""Sentences for every way in which strategies can agree or not. Invented estimates."""

from __future__ import annotations

import math

import pytest
from test_report_numbers import plain

from drystone.report import sentences
from drystone.report.sentences import StrategyEstimate, verdict

NAN = math.nan


def estimate(name: str, middle: float, half: float = 0.05) -> StrategyEstimate:
    return StrategyEstimate(name, middle, middle - half, middle + half)


REFUSED = StrategyEstimate("C", NAN, NAN, NAN, refused="too few studies")


def said(*items: StrategyEstimate) -> tuple[bool | None, str]:
    answer = verdict(items, 95.0)
    return answer.holds, plain(" ".join(answer.sentences))


def test_all_agree() -> None:
    holds, text = said(estimate("A", 0.10), estimate("B", 0.12))
    assert holds is True
    assert text == (
        "Sign, interval and size hold over 2 strategies. Every estimate is positive. "
        "Every 95 % interval excludes zero. Estimates run from +11 % to +13 %."
    )


def test_all_agree_that_nothing_is_settled() -> None:
    holds, text = said(estimate("A", 0.040), estimate("B", 0.041))
    assert holds is True
    assert "Every 95 % interval includes zero." in text


def test_sign_flips() -> None:
    holds, text = said(estimate("A", 0.1), estimate("B", -0.1), estimate("C", 0.12))
    assert holds is False
    assert text.startswith("The sign does not hold: positive under A and C; negative under B.")


def test_interval_excludes_zero_under_some_only() -> None:
    holds, text = said(estimate("A", 0.06), estimate("B", 0.06, half=0.2))
    assert holds is False
    assert text.startswith(
        "Whether the 95 % interval excludes zero depends on the strategy: it does under A; it "
        "does not under B."
    )
    assert "Every estimate is positive." in text


def test_size_differs() -> None:
    holds, text = said(estimate("A", 0.2), estimate("B", 0.1))
    assert holds is False
    assert text.startswith(
        "The size does not hold: +22 % under A is 2.0 times the +11 % under B, measured on the "
        "log scale."
    )


def test_size_within_the_factor_holds() -> None:
    assert said(estimate("A", 0.149), estimate("B", 0.1))[0] is True
    assert said(estimate("A", 0.151), estimate("B", 0.1))[0] is False


def test_a_refused_strategy_is_named() -> None:
    holds, text = said(estimate("A", 0.1), estimate("B", 0.11), REFUSED)
    assert holds is True
    assert text.endswith("No result under C: too few studies.")


def test_one_or_none_gives_no_verdict() -> None:
    assert said(estimate("A", 0.1), REFUSED)[0] is None
    assert said(REFUSED) == (
        None,
        "No strategy gave an overall effect. No result under C: too few studies.",
    )
    assert said()[0] is None


def test_zero_is_neither_positive_nor_negative() -> None:
    holds, text = said(estimate("A", 0.0), estimate("B", 0.1))
    assert holds is False
    assert "zero under A" in text


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
