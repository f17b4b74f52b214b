"""Cells with half a character, as broken converters write them."""

from __future__ import annotations

from drystone.sheet.raw import show


def test_lone_surrogates_are_shown_as_a_mark_that_can_be_written():
    assert show("a\udc5eb") == "a?b"
    show("é \udc5e").encode("utf-8")
