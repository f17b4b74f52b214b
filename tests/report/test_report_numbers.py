"""Numbers as text. Expected texts were worked out by hand: 100 (exp(x) - 1), then rounded."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from drystone.report import numbers

LOG = math.log


def plain(text: str) -> str:
    """Text with ordinary spaces and minus signs, so that expectations can be read."""
    for fancy, simple in ((numbers.FIXED_SPACE, " "), (numbers.THIN_SPACE, " "), ("−", "-")):
        text = text.replace(fancy, simple)
    return text


@pytest.mark.parametrize(
    ("ratio", "text"),
    [
        (1.12, "+12 %"),
        (0.92, "-8.0 %"),
        (1.004, "+0.40 %"),
        (1.0, "0 %"),
        (0.5, "-50 %"),
        (31.0, "+3 000 %"),
    ],
)
def test_percent_has_a_sign_and_two_or_three_digits(ratio: float, text: str) -> None:
    assert plain(numbers.percent(LOG(ratio))) == text


def test_estimate_and_limits_share_their_decimals() -> None:
    text = numbers.percent_with_interval(LOG(1.12), LOG(1.04), LOG(1.21))
    assert plain(text) == "+12 % (4 to 21)"
    text = numbers.percent_with_interval(LOG(1.012), LOG(0.996), LOG(1.03))
    assert plain(text) == "+1.2 % (-0.4 to 3.0)"


def test_a_limit_above_zero_never_prints_as_zero() -> None:
    assert plain(numbers.percent_interval(LOG(1.002), LOG(1.25))) == "0.2 to 25"
    assert plain(numbers.percent_interval(LOG(0.998), LOG(1.25))) == "-0.2 to 25"


def test_a_ratio_above_nothing_never_prints_as_minus_hundred() -> None:
    assert plain(numbers.percent_interval(LOG(0.0004), LOG(2))) == "-99.96 to 100"


def test_missing_numbers_say_so() -> None:
    assert numbers.percent(math.nan) == numbers.NOT_KNOWN
    assert numbers.percent_interval(math.nan, 1.0) == numbers.NOT_KNOWN
    assert plain(numbers.percent_with_interval(LOG(1.12), math.nan, math.nan)) == "+12 %"
    assert numbers.number(math.nan) == numbers.NOT_KNOWN
    assert numbers.typed(None) == ""


def test_overflow_is_said_in_words() -> None:
    assert plain(numbers.percent(800.0)) == "more than 1 000 000 000 %"


@given(st.floats(-3, 3), st.floats(0.0001, 2), st.floats(0.0001, 2))
def test_printed_limits_never_change_side(middle: float, below: float, above: float) -> None:
    low, high = middle - below, middle + above
    parts = plain(numbers.percent_interval(low, high)).split(" to ")
    first, second = (float(part.replace(" ", "")) for part in parts)
    assert first <= second
    for limit, printed in ((low, first), (high, second)):
        if abs(limit) > 1e-7:
            assert (printed > 0) == (limit > 0)
            assert (printed < 0) == (limit < 0)


@pytest.mark.parametrize(
    ("value", "text"), [(0.000123, "0.000123"), (12345.6, "12 346"), (0.0, "0"), (-1.5, "-1.50")]
)
def test_number_keeps_three_digits(value: float, text: str) -> None:
    assert plain(numbers.number(value)) == text


@pytest.mark.parametrize(
    ("value", "text"),
    [(0.996, "> 99 %"), (0.99999, "> 99 %"), (0.994, "99 %"), (1.0, "100 %"), (0.0, "0 %"),
     (0.0001, "< 0.1 %"), (0.0008, "0.1 %"), (0.0994, "9.9 %"), (0.0999, "10 %")],
)  # fmt: skip
def test_only_all_prints_as_all_and_nothing_as_nothing(value: float, text: str) -> None:
    assert plain(numbers.share(value)) == text


def test_numbers_without_end_are_words() -> None:
    assert numbers.number(math.inf) == "infinite"
    assert plain(numbers.number(-math.inf)) == "-infinite"


def test_a_number_below_a_limit_never_prints_as_the_limit() -> None:
    assert numbers.below(3.98, 4.0) == "3.98"
    assert numbers.below(3.99987, 4.0) == "3.9999"


def test_small_words() -> None:
    assert plain(numbers.count(1, "study", "studies")) == "1 study"
    assert plain(numbers.count(1200, "row")) == "1 200 rows"
    assert numbers.p_value(0.0004) == "< 0.001"
    assert numbers.p_value(0.0312) == "0.031"
    assert plain(numbers.share(0.314)) == "31 %"
    assert plain(numbers.level_percent(95.0)) == "95 %"
    assert numbers.amount(7.0) == "7"
    assert numbers.amount(6.25) == "6.25"
