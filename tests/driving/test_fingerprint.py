"""Fingerprints: what counts as a change of code."""

from __future__ import annotations

import pytest

from drystone.driving.fingerprint import CodeIndex, digest, module_path, syntax_digest
from drystone.stages.strategies import REGISTRY

PLAIN = b"def f(x):\n    return x + 1\n"


@pytest.mark.parametrize(
    "same",
    [
        b"# a comment\ndef f(x):\n    return x + 1  # another\n",
        b'"""Module text."""\ndef f(x):\n    """Say what it does."""\n    return x + 1\n',
        b"def f( x ):\n\n    return (x + 1)\n",
    ],
)
def test_comment_docstring_and_layout_do_not_count(same):
    assert syntax_digest(same) == syntax_digest(PLAIN)


@pytest.mark.parametrize(
    "other", [b"def f(x):\n    return x + 2\n", b"def g(x):\n    return x + 1\n", b"x = 'text'\n"]
)
def test_body_and_names_count(other):
    assert syntax_digest(other) != syntax_digest(PLAIN)


def test_a_strategy_does_not_depend_on_another():
    index = CodeIndex()
    complete, missing, every = (index.closure([module]) for module in REGISTRY.values())
    assert "drystone.stages.strategies.averages" not in complete
    assert "drystone.stages.strategies.all_cases" not in missing
    assert "drystone.stages.strategies.missing_cases" not in every


def test_fit_depends_on_the_engine_and_not_on_the_report_or_the_config_models():
    found = CodeIndex().closure(["drystone.stages.fit_model"])
    assert "drystone.maths.mixed_model.optimise" in found
    assert not [name for name in found if name.startswith("drystone.report")]
    assert "drystone.settings.model" not in found


def test_report_depends_on_its_templates():
    index = CodeIndex()
    found = index.closure(["drystone.stages.render_report"])
    folder = module_path("drystone.report").parent / "templates"
    assert any(folder.iterdir())
    assert len(found["drystone.report"]) > 16  # digest of the code and of the templates


def test_libraries_are_those_that_the_modules_name():
    index = CodeIndex()
    fit = index.libraries(["drystone.stages.fit_model"])
    assert {"numpy", "scipy", "pandas", "formulaic"} <= set(fit)
    assert "openpyxl" not in fit


def test_remembered_fingerprints_are_the_same():
    first = CodeIndex()
    found = first.closure(["drystone.stages.fill_spreads"])
    again = CodeIndex(first.memory())
    assert again.closure(["drystone.stages.fill_spreads"]) == found
    assert again.memory() == first.memory()


def test_digest_does_not_depend_on_the_order_of_keys():
    assert digest({"a": 1, "b": [2]}) == digest({"b": [2], "a": 1}) != digest({"a": 1, "b": [3]})


def test_unknown_module_is_refused():
    with pytest.raises(LookupError, match="no module"):
        module_path("drystone.nothing")
