"""Real sheets that others collected, against fits stored beside them.

The stored fits come from plain numerical searches (bounded scalar, Nelder-Mead) that share no code
with the engine; see the README of the data collection. The tables stand outside of the repository.
"""

import csv
import json
from itertools import combinations
from pathlib import Path

import numpy as np
import pytest

from drystone.maths import heterogeneity
from drystone.maths.mixed_model import KnownCovariance, Prepared, Problem, fit, prepare

DATA = Path(__file__).parents[4] / "shared" / "data"
FOLDERS = sorted(path.parent.name for path in DATA.glob("*/expected_rows.csv"))
pytestmark = pytest.mark.skipif(
    not FOLDERS, reason="the open data collection stands outside of the repository"
)

#: What the stored searches promise: a scalar search to 1e-13, a simplex to 1e-6 in log variance.
SCALAR_SEARCH = 1e-5
SIMPLEX_SEARCH = 2e-4


def _table(path: Path) -> list[dict[str, str]]:
    with path.open(newline="", encoding="utf-8") as handle:
        return list(csv.DictReader(handle))


def _usable(folder: str) -> tuple[list[dict[str, str]], dict]:
    rows = [row for row in _table(DATA / folder / "expected_rows.csv") if row["usable"] == "True"]
    return rows, json.loads((DATA / folder / "expected.json").read_text())


def _column(rows: list[dict[str, str]], name: str) -> np.ndarray:
    return np.array([float(row[name]) for row in rows])


def _prepare(y: np.ndarray, study: np.ndarray, known: KnownCovariance, terms) -> Prepared:
    return prepare(Problem(y, np.ones((len(y), 1)), ("overall",), study, known, terms))


@pytest.mark.parametrize("folder", FOLDERS)
@pytest.mark.parametrize(
    ("stored", "estimator", "y", "v"),
    [
        ("reml_lnrr_v1", "REML", "lnrr", "v1"),
        ("ml_lnrr_v1", "ML", "lnrr", "v1"),
        ("reml_lnrrbc_v2", "REML", "lnrr_bc", "v2"),
    ],
)
def test_one_level(folder, stored, estimator, y, v):
    rows, expected = _usable(folder)
    if stored not in expected:
        pytest.skip(f"{stored} is not stored for this table")
    expected = expected[stored]
    known = KnownCovariance(_column(rows, v))
    prepared = _prepare(_column(rows, y), np.arange(len(rows)), known, ("row",))
    fitted = fit(prepared, estimator)
    assert fitted.rows == expected["k"]
    found = [fitted.coefficients[0], fitted.standard_errors[0], fitted.components["row"]]
    np.testing.assert_allclose(
        found, [expected[key] for key in ("mu", "se", "tau2")], rtol=SCALAR_SEARCH
    )
    q = heterogeneity.homogeneity_test(prepared).q
    assert q == pytest.approx(expected["Q"], rel=1e-6)  # eight digits are stored per row


def _sheet(folder: str) -> dict[str, dict[str, str]]:
    for name in ("sheet.csv", "canonical.csv"):
        if (DATA / folder / name).exists():
            return {row["row_id"]: row for row in _table(DATA / folder / name)}
    pytest.skip("no sheet is stored for this table")


def _shared_controls(rows, sheet) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    groups: dict[str, list[int]] = {}
    for place, row in enumerate(rows):
        groups.setdefault(sheet[row["row_id"]]["control_id"], []).append(place)
    pairs = [pair for places in groups.values() for pair in combinations(places, 2)]
    i, j = np.array(pairs, dtype=int).reshape(-1, 2).T
    c = _column(rows, "c")
    return i, j, np.sqrt(c[i] * c[j])


@pytest.mark.parametrize("folder", FOLDERS)
def test_two_levels_with_shared_controls(folder):
    rows, expected = _usable(folder)
    names = ("reml_multilevel_sharedV_lnrr", "reml_multilevel_study_sharedV")
    stored = next((expected[name] for name in names if name in expected), None)
    if stored is None:
        pytest.skip("no fit with two levels is stored for this table")
    sheet = _sheet(folder)
    labels = [sheet[row["row_id"]]["study"] for row in rows]
    study = np.unique(labels, return_inverse=True)[1]
    i, j, c = _shared_controls(rows, sheet)
    known = KnownCovariance(_column(rows, "v1"), i, j, c)
    fitted = fit(_prepare(_column(rows, "lnrr"), study, known, ("study", "row")))
    assert (fitted.rows, fitted.studies) == (stored["k"], stored["n_groups"])
    constants = -0.5 * (fitted.rows - 1) * np.log(2 * np.pi) + 0.5 * np.log(fitted.rows)
    assert fitted.log_likelihood == pytest.approx(stored["loglik_no_const"] + constants, abs=1e-5)
    found = [fitted.coefficients[0], *fitted.theta, fitted.standard_errors[0]]
    expected = [stored[key] for key in ("mu", "sigma2_group", "tau2_row", "se")]
    np.testing.assert_allclose(found, expected, rtol=SIMPLEX_SEARCH, atol=1e-9)
