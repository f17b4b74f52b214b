"""YAML as data only."""

from __future__ import annotations

import pytest

from drystone.settings.problems import ConfigProblem
from drystone.settings.strict_yaml import load_strict, parse_strict


def test_country_codes_dates_and_switches_stay_text():
    content = parse_strict("a: NO\nb: on\nc: 2019-05-01\nd: 1_000\ne: 0x1F\nf: 1:30").content
    assert content == {
        "a": "NO",
        "b": "on",
        "c": "2019-05-01",
        "d": "1_000",
        "e": "0x1F",
        "f": "1:30",
    }


def test_plain_values_have_their_types():
    content = parse_strict("a: 3\nb: 2.5\nc: true\nd: ~\ne: 1e-3\nf: -7\ng: .5").content
    assert content == {"a": 3, "b": 2.5, "c": True, "d": None, "e": 1e-3, "f": -7, "g": 0.5}


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("a: 1\nb: 2\na: 3", "line 3: names 'a' twice (lines 1 and 3)"),
        ("a:\n  b: 1\n  b: 2", "line 3: names 'b' twice (lines 2 and 3)"),
        ("a: !!python/object/apply:os.system ['true']", "line 1: uses the tag"),
        ("a: !include other.yaml", "line 1: uses the tag '!include'"),
        ("a: &x [1]\nb: *x", "line 1: uses an anchor"),
        ("a: [1, 2", "not valid YAML"),
        ("a:\n\t- b", "line 2: is not valid YAML"),
        ("? [1]\n: 2", "key that is not plain text"),
        ("a: " + "[" * 5000 + "]" * 5000, "nested far too deeply"),
        ("a: " + "[" * 60 + "]" * 60, "nested far too deeply"),
    ],
)
def test_anything_else_is_refused_with_its_line(text, said):
    with pytest.raises(ConfigProblem) as caught:
        parse_strict(text)
    assert said in str(caught.value)


def test_template_expressions_are_text():
    """Snakemake's own config reader would run this through a template engine."""
    assert parse_strict("__definitions__:\n- import os\n'?x': 1").content == {
        "__definitions__": ["import os"],
        "?x": 1,
    }


def test_file_problems_are_sentences(tmp_path):
    with pytest.raises(ConfigProblem, match="does not exist"):
        load_strict(tmp_path / "none.yaml")
    path = tmp_path / "latin.yaml"
    path.write_bytes("a: \xe9".encode("latin-1"))
    with pytest.raises(ConfigProblem, match="not UTF-8"):
        load_strict(path)
    path.write_text("a: " + "x" * 1_100_000)
    with pytest.raises(ConfigProblem, match="larger than 1 MB"):
        load_strict(path)
    with pytest.raises(ConfigProblem, match="cannot be read"):
        load_strict(tmp_path)
