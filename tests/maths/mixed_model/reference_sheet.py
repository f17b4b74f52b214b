"""The 12-row sheet of tests/reference/checks.json, with its known covariance from first principles.

Formulas (Hedges, Gurevitch & Curtis 1999; Lajeunesse 2011, 2015): y = ln(mt/mc),
v = a + b with a = CVt^2/nt, b = CVc^2/nc; second order y + (a - b)/2 and v + (a^2 + b^2)/2;
rows that share a control have covariance b, second order b + b^2/2.
"""

import json
from pathlib import Path
from typing import Any

import numpy as np

from drystone.maths.mixed_model import KnownCovariance, Problem

REFERENCE = Path(__file__).parents[2] / "reference" / "checks.json"
TIMES = json.loads(REFERENCE.read_text())


def check(name: str) -> dict[str, Any]:
    """The expected values of one check, as text or lists of text."""
    return next(c for c in TIMES["checks"] if c["id"] == name)["expect"]


def numbers(value: Any) -> np.ndarray:
    """A check value as floats."""
    return np.array(value, dtype=np.float64)


def table() -> dict[str, np.ndarray]:
    """Columns of the sheet; a missing SD is NaN."""
    columns = TIMES["sheet"]["columns"]
    values = list(zip(*TIMES["sheet"]["rows"], strict=True))
    text = {"row", "study", "species", "arm_t", "arm_c"}
    return {
        name: np.array(column if name in text else [_number(x) for x in column])
        for name, column in zip(columns, values, strict=True)
    }


def _number(value: Any) -> float:
    try:
        return float(value)
    except (TypeError, ValueError):
        return np.nan


def coefficients_of_variation(strategy: str) -> tuple[np.ndarray, np.ndarray]:
    """Squared CVs of the treatment and control arms under `strategy`."""
    sheet = table()
    own_t = (sheet["sd_t"] / sheet["mean_t"]) ** 2
    own_c = (sheet["sd_c"] / sheet["mean_c"]) ** 2
    if strategy == "complete_case":
        return own_t, own_c
    unique = np.unique(sheet["arm_c"], return_index=True)[1]
    average_t = _weighted(own_t, sheet["n_t"])
    average_c = _weighted(own_c[unique], sheet["n_c"][unique])
    if strategy == "all_cases":
        return np.full_like(own_t, average_t), np.full_like(own_c, average_c)
    return np.where(np.isnan(own_t), average_t, own_t), np.where(np.isnan(own_c), average_c, own_c)


def _weighted(values: np.ndarray, n: np.ndarray) -> float:
    known = ~np.isnan(values)
    return float((n[known] * values[known]).sum() / n[known].sum())


def problem(
    strategy: str,
    order: str = "first",
    *,
    terms: tuple[str, ...] = ("study", "row"),
    moderator: np.ndarray | None = None,
    centre: float = 0.0,
) -> Problem:
    """The mixed-model problem of one missing-SD strategy."""
    sheet = table()
    cv2_t, cv2_c = coefficients_of_variation(strategy)
    a, b = cv2_t / sheet["n_t"], cv2_c / sheet["n_c"]
    y, v, shared = np.log(sheet["mean_t"] / sheet["mean_c"]), a + b, b
    if order == "second":
        y, v, shared = y + (a - b) / 2, v + (a**2 + b**2) / 2, b + b**2 / 2
    keep = np.flatnonzero(~np.isnan(v))
    pairs = _pairs(sheet["arm_c"][keep])
    X = np.ones((len(keep), 1))
    names = ["overall"]
    if moderator is not None:
        X, names = np.column_stack([X, moderator[keep] - centre]), [*names, "moderator"]
    known = KnownCovariance(v[keep], pairs[:, 0], pairs[:, 1], shared[keep][pairs[:, 0]])
    study = np.unique(sheet["study"][keep], return_inverse=True)[1]
    return Problem(y[keep], X, tuple(names), study, known, terms)


def _pairs(control: np.ndarray) -> np.ndarray:
    same = np.triu(control[:, None] == control[None, :], 1)
    return np.argwhere(same)
