"""What each coefficient of a model with moderators stands for, in words.

A category is coded against one level, the first in alphabetical order among the rows of the fit;
that level is absent from the names of the coefficients. Without an intercept the first category is
coded in full, and its coefficients are means of groups.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass

import pandas as pd

from drystone.report import numbers
from drystone.report.sentences import listed
from drystone.settings.formulas import columns_of
from drystone.words.scales import OVERALL

INTERCEPT = "intercept"
INTERACTION = "interaction: change of a difference or slope"


@dataclass(frozen=True)
class Moderator:
    """One column of the sheet in a formula.

    Parameters
    ----------
    name : name of the column
    levels : levels among the rows of the fit; empty for a column of numbers
    reference : level that the others are held against; blank when there is none
    low, high : range of a column of numbers
    """

    name: str
    levels: tuple[str, ...]
    reference: str = ""
    low: float = 0.0
    high: float = 0.0

    def label(self, level: str) -> str:
        """Name of the coefficient of ``level``."""
        return f"{self.name} = {level}"

    def forms(self) -> tuple[str, ...]:
        """Names that a column of numbers may have as a coefficient."""
        return (self.name, *(f"{what}({self.name})" for what in ("log", "center", "scale")))


def moderators(formula: str, coefficients: Sequence[str], rows: pd.DataFrame) -> list[Moderator]:
    """Columns of ``formula`` with their levels and references.

    Parameters
    ----------
    formula : as in the config
    coefficients : names of the fit's coefficients
    rows : slice rows that the strategy uses; those with a blank moderator are left out here
    """
    names = [name for name in columns_of(formula) if name in rows.columns]
    kept = rows.dropna(subset=names)
    return [_moderator(name, kept[name], formula, coefficients) for name in names]


def meaning(name: str, known: Sequence[Moderator], coefficients: Sequence[str]) -> str:
    """What the coefficient called ``name`` stands for."""
    if name in (INTERCEPT, OVERALL):
        return f"mean {_where(known, coefficients)}".rstrip()
    for moderator in known:
        for level in moderator.levels:
            if name == moderator.label(level):
                return _of_level(moderator, level, known, coefficients)
        if not moderator.levels and name in moderator.forms():
            return _slope(moderator, name)
    return _combined(known, coefficients)


def references(known: Sequence[Moderator]) -> str:
    """Sentence that names the reference level of every category; blank when there is none."""
    parts = [f"{item.name} = {item.reference}" for item in known if item.reference]
    return f"Reference: {listed(parts)}." if parts else ""


def _moderator(
    name: str, column: pd.Series, formula: str, coefficients: Sequence[str]
) -> Moderator:
    as_category = re.search(rf"\bC\(\s*`?{re.escape(name)}`?\s*\)", formula) is not None
    if pd.api.types.is_numeric_dtype(column.dtype) and not as_category:
        low, high = (float(column.min()), float(column.max())) if len(column) else (0.0, 0.0)
        return Moderator(name, (), "", low, high)
    levels = tuple(str(level) for level in sorted(column.unique()))
    absent = [level for level in levels if f"{name} = {level}" not in coefficients]
    alone = len(absent) == 1 and len(levels) > 1
    return Moderator(name, levels, absent[0] if alone else "")


def _of_level(
    moderator: Moderator, level: str, known: Sequence[Moderator], coefficients: Sequence[str]
) -> str:
    if moderator.reference:
        return f"{level} against {moderator.reference}"
    others = [item for item in known if item is not moderator]
    return f"mean of {level} {_where(others, coefficients)}".rstrip()


def _where(known: Sequence[Moderator], coefficients: Sequence[str]) -> str:
    """Where the other moderators stand: at their reference, at zero, at their mean."""
    parts = []
    for item in known:
        if item.reference:
            parts.append(f"{item.name} = {item.reference}")
        elif not item.levels:
            parts.append(_origin(item, coefficients))
    return f"at {listed(parts)}" if parts else ""


def _origin(item: Moderator, coefficients: Sequence[str]) -> str:
    used = [form for form in item.forms() if form in coefficients]
    if used and used[0].startswith(("center(", "scale(")):
        return f"the mean of {item.name}"
    zero = 1.0 if used and used[0].startswith("log(") else 0.0
    text = f"{item.name} = {zero:g}"
    if item.low <= zero <= item.high:
        return text
    return f"{text} (outside the data, {numbers.number_interval(item.low, item.high)})"


def _slope(moderator: Moderator, name: str) -> str:
    if name.startswith("scale("):
        return f"slope per SD of {moderator.name}"
    if name.startswith("log("):
        return f"slope per unit of log {moderator.name} (as it grows 2.72 times)"
    return f"slope per unit of {moderator.name}"


def _combined(known: Sequence[Moderator], coefficients: Sequence[str]) -> str:
    """An interaction bends main terms; without those it is a group's own mean or slope."""
    mains = {form for item in known if not item.levels for form in item.forms()}
    mains |= {item.label(level) for item in known for level in item.levels}
    if mains & set(coefficients):
        return INTERACTION
    return "mean or slope of this combination"
