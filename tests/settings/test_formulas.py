"""Moderator formulas: what passes, what is refused before a library sees it."""

from __future__ import annotations

import pytest

from drystone.settings.formulas import FormulaProblem, check_formula, columns_of, is_intercept_only


@pytest.mark.parametrize(
    ("text", "columns"),
    [
        ("~ 1", ()),
        ("~ crop", ("crop",)),
        ("~ 0 + crop", ("crop",)),
        ("~ crop - 1", ("crop",)),
        ("~ crop:depth + log(n_rate)", ("crop", "depth", "n_rate")),
        ("~ crop * center(depth)", ("crop", "depth")),
        ("~ C(site) + scale(ph)", ("site", "ph")),
        ("~ `wall height, m` + crop", ("wall height, m", "crop")),
    ],
)
def test_allowed_formulas_name_their_columns(text, columns):
    assert check_formula(text) == text
    assert columns_of(text) == columns
    assert is_intercept_only(text) == (not columns)


@pytest.mark.parametrize(
    "text",
    [
        "crop",
        "~",
        "~ __import__('os').system('true')",
        "~ os.system",
        "~ {open('x')}",
        "~ (lambda: 1)()",
        "~ [c for c in 'ab']",
        "~ log(crop, 2)",
        "~ log(x=crop)",
        "~ log(log(crop))",
        "~ exp(crop)",
        "~ crop ** 2",
        "~ crop / depth",
        "~ 'crop'",
        "~ 2",
        "~ True",
        "~ crop @ depth",
        "~ crop - depth",
        "~ crop; depth",
        "~ crop if depth else 1",
        "~ " + "a + " * 300 + "a",
        "~ " + "(" * 90 + "a" + ")" * 90 + "[",
    ],
)
def test_everything_else_is_refused(text):
    with pytest.raises(FormulaProblem):
        check_formula(text)
