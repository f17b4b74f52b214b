"""The formula sheet's entries, by id."""

from __future__ import annotations

import json
from functools import cache
from pathlib import Path


@cache
def _content() -> dict:
    return json.loads((Path(__file__).parent / "checks.json").read_text(encoding="utf-8"))


def check(name: str) -> dict:
    """Inputs and expected numbers of one entry (tests/reference/checks.json)."""
    return next(entry for entry in _content()["checks"] if entry["id"] == name)


def sheet() -> dict:
    """Columns and rows of the invented twelve-row sheet."""
    return _content()["sheet"]
