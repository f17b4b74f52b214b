"""What a cell says: numbers, missing words, and texts that are no number."""

import datetime
import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from drystone.sheet.parse import parse_number, parse_text
from drystone.sheet.raw import Broken, letters, show


@pytest.mark.parametrize(
    ("cell", "number"),
    [
        (12.5, 12.5),
        (3, 3.0),
        ("12.5", 12.5),
        (" 12.5 ", 12.5),
        ("\u00a012.5", 12.5),
        ("-3", -3.0),
        ("+3.", 3.0),
        (".5", 0.5),
        ("1e-3", 0.001),
    ],
)
def test_plain_numbers_are_read(cell, number):
    assert parse_number(cell) == (number, "")


@pytest.mark.parametrize("cell", ["", None, " ", "NA", "n/a", "N.A.", "-", "–", ".", "nd", "?"])
def test_missing_words_are_missing_numbers(cell):
    number, wrong = parse_number(cell)
    assert math.isnan(number)
    assert wrong == ""


@pytest.mark.parametrize(
    ("cell", "word"),
    [
        ("12,5", "decimal comma"),
        ("1,234", "thousands"),
        ("1,234.5", "thousands"),
        ("1.234,5", "thousands"),
        ("−3.2", "dash"),
        ("–3.2", "dash"),
        ("1 234", "space"),
        ("1\u00a0234", "space"),
        ("1'234", "apostrophe"),
        ("<5", "bound"),
        (">= 4", "bound"),
        ("~5", "approximate"),
        ("ca. 5", "approximate"),
        ("3-5", "range"),
        ("3 – 5", "range"),
        ("4 or 5", "range"),
        ("12.3*", "mark"),
        ("12.3a", "mark"),
        ("12 %", "percent"),
        ("3.2 ± 0.4", "spread"),
        ("2020-01-02", "date"),
        ("1/2/2020", "date"),
        ("nan", "finite"),
        ("-inf", "finite"),
        ("1e400", "finite"),
        ("1_000", "not a number"),
        ("١٢", "not a number"),
        ("twelve", "not a number"),
        ("#DIV/0!", "error value"),
        (True, "true or false"),
        (math.inf, "finite"),
        (math.nan, "finite"),
        (10**400, "finite"),
        (datetime.date(2020, 1, 2), "date"),
        (datetime.time(3, 4), "date or time"),
        (Broken("#REF!"), "error value"),
        (Broken("", unsaved=True), "not saved"),
    ],
)
def test_anything_else_is_trouble_and_says_which(cell, word):
    number, wrong = parse_number(cell)
    assert math.isnan(number)
    assert word in wrong


@given(st.floats(allow_nan=False, allow_infinity=False))
def test_every_finite_number_survives_as_text(number):
    assert parse_number(repr(number)) == (number, "")


@given(st.one_of(st.text(), st.integers(), st.floats(), st.booleans(), st.none(), st.datetimes()))
def test_a_number_is_finite_or_missing(cell):
    number, wrong = parse_number(cell)
    assert math.isfinite(number) or math.isnan(number)
    assert not (wrong and math.isfinite(number))


@pytest.mark.parametrize(
    ("cell", "text", "changed"),
    [
        (1999.0, "1999", False),
        (19.5, "19.5", False),
        ("  Alder 2001 ", "Alder 2001", False),
        ("Alder  2001", "Alder 2001", True),
        ("Alder\u00a02001", "Alder 2001", True),
        ("Al\u200bder", "Alder", True),
        ("e\u0301", "é", False),
        ("NA", None, False),
        ("Na", "Na", False),
        ("none", "none", False),
        ("", None, False),
        (None, None, False),
        (True, "TRUE", False),
        (datetime.datetime(2020, 1, 2), "2020-01-02", False),
        (Broken("#REF!"), None, False),
    ],
)
def test_texts_are_tidied(cell, text, changed):
    assert parse_text(cell) == (text, changed)


@given(st.text(alphabet=st.characters()))
def test_tidy_text_stays_as_it_is(typed):
    once, _ = parse_text(typed)
    if once is not None:
        assert parse_text(once)[0] in (once, None)


def test_letters_count_like_a_spreadsheet():
    # by hand: 26 letters, then two of them; XFD is the last column of an .xlsx sheet, 16384
    assert [letters(i) for i in (0, 25, 26, 701, 702, 16_383)] == [
        "A",
        "Z",
        "AA",
        "ZZ",
        "AAA",
        "XFD",
    ]


def test_whole_floats_show_without_a_point():
    assert [show(cell) for cell in (2.0, 2.5, 1e300, True, None)] == [
        "2",
        "2.5",
        "1e+300",
        "TRUE",
        "",
    ]
