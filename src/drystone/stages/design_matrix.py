"""Design matrix of a model from its formula and the slice's columns."""

from __future__ import annotations

import re
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from drystone.settings.formulas import check_formula, columns_of
from drystone.words.scales import OVERALL


class DesignProblem(ValueError):
    """A formula that these rows cannot fill."""


@dataclass(frozen=True)
class Design:
    """Matrix (k, p), its coefficient names (p,), and which rows of the input it holds."""

    matrix: NDArray[np.float64]
    names: tuple[str, ...]
    kept: NDArray[np.bool_]


def design_matrix(formula: str, rows: pd.DataFrame) -> Design:
    """Build the design of ``formula``; rows with a blank moderator are marked as not kept.

    Raises
    ------
    DesignProblem
        When a column is absent, a category has one level only, or a logarithm meets a number that
        is not positive.
    """
    names = columns_of(check_formula(formula))
    kept = rows[list(names)].notna().all(axis=1).to_numpy() if names else np.ones(len(rows), bool)
    if not names and "0" not in formula and "- 1" not in formula:
        return Design(np.ones((len(rows), 1)), (OVERALL,), kept)
    if not kept.any():
        raise DesignProblem(f"every row is blank in {' or '.join(names)}")
    data = rows.loc[kept, list(names)].reset_index(drop=True)
    _check_columns(formula, data)
    matrix, labels = _build(formula, data)
    return Design(matrix, labels, kept)


def _build(formula: str, data: pd.DataFrame) -> tuple[NDArray[np.float64], tuple[str, ...]]:
    from formulaic import Formula

    if data.empty and not len(data.columns):
        data = pd.DataFrame({"unused": np.ones(len(data))})
    try:
        frame = Formula(formula).get_model_matrix(data, context={})
    except Exception as error:  # the library raises many kinds; the formula was allow-listed before
        raise DesignProblem(f"formula '{formula}' cannot be filled: {error}") from error
    matrix = np.asarray(frame, dtype=float)
    if not np.isfinite(matrix).all():
        raise DesignProblem(f"formula '{formula}' gives a value that is not a finite number")
    labels = tuple(_label(str(name)) for name in frame.columns)
    return matrix, labels if labels != ("intercept",) else (OVERALL,)


def _check_columns(formula: str, data: pd.DataFrame) -> None:
    for name in data.columns:
        column = data[name]
        if not pd.api.types.is_numeric_dtype(column.dtype) and column.nunique() < 2:
            raise DesignProblem(f"{name} has one level only ('{column.iloc[0]}')")
        positive = pd.api.types.is_numeric_dtype(column.dtype) and (column > 0).all()
        if f"log({name})" in formula.replace("`", "") and not positive:
            raise DesignProblem(f"log({name}) needs numbers above zero")


def _label(name: str) -> str:
    """Readable coefficient name: 'crop[T.maize]' becomes 'crop = maize'."""
    if name == "Intercept":
        return "intercept"
    return " x ".join(_label_part(part) for part in name.split(":"))


def _label_part(part: str) -> str:
    plain = re.sub(r"C\((.*?)\)", r"\1", part)
    return plain.replace("[T.", " = ").replace("[", " = ").rstrip("]")
