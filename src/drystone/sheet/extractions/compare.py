"""Disagreements of two extractions by cell, what each does to the log ratio, and agreement."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from typing import Any

import numpy as np
import pandas as pd

from drystone.maths.agreement import cohen_kappa
from drystone.maths.log_ratio import first_order, theta
from drystone.sheet.extractions.match import Pair, same_text
from drystone.sheet.intake import Intake
from drystone.tables.comparisons import COLUMNS, NUMBER_COLUMNS
from drystone.words import arms

NOT_COMPARED = frozenset({"row_id", "note", "extractor", "checker"})
WHOLE_ROW = "(whole row)"
MOST_CATEGORIES = 20
DISAGREEMENTS = (
    *("row", "study", "outcome", "column", "a", "b", "cell_a", "cell_b", "difference_percent"),
    *("log_ratio_change", "standard_error_change", "resolution", "resolved_by"),
)
AGREEMENT = ("column", "compared", "agreeing", "percent", "kappa")


def compared_columns(first: Intake, second: Intake) -> list[str]:
    """Columns that both sheets have, ours and moderators, in the order of the first."""
    ours = [name for name in COLUMNS if name in first.columns and name in second.columns]
    shared = [name for name in first.moderators if name in second.moderators]
    return [name for name in (*ours, *shared) if name not in NOT_COMPARED]


def disagreements(
    first: Intake, second: Intake, pairs: Sequence[Pair], tolerance: float
) -> pd.DataFrame:
    """One row = one cell that differs, or one row that only one sheet has.

    Parameters
    ----------
    pairs : places of the rows that are the same, see `match.match_rows`
    tolerance : relative difference of two numbers that is none

    Notes
    -----
    ``log_ratio_change`` and ``standard_error_change`` are those of the first sheet's row when this
    one cell is taken from the second (first order; for a spread, the SD that follows from it).
    """
    lines = list(_only(first, {i for i, _ in pairs}, "a"))
    lines += _only(second, {j for _, j in pairs}, "b")
    for column in compared_columns(first, second):
        equal = _equal(first.rows, second.rows, pairs, column, tolerance)
        for (i, j), same in zip(pairs, equal, strict=True):
            if not same:
                lines.append(_line(first, second, i, j, column))
    table = pd.DataFrame(lines, columns=list(DISAGREEMENTS))
    size = table["log_ratio_change"].astype(float).abs().fillna(-1.0)
    return table.iloc[np.argsort(-size.to_numpy(), kind="stable")].reset_index(drop=True)


def agreement(
    first: Intake, second: Intake, pairs: Sequence[Pair], tolerance: float
) -> pd.DataFrame:
    """One row = one column: cells filled in either sheet, how many agree, kappa of categories."""
    lines = []
    for column in compared_columns(first, second):
        equal = _equal(first.rows, second.rows, pairs, column, tolerance)
        cells = [(first.rows[column].iloc[i], second.rows[column].iloc[j]) for i, j in pairs]
        filled = np.array([bool(same_text(a) or same_text(b)) for a, b in cells], dtype=bool)
        compared, agreeing = int(filled.sum()), int((equal & filled).sum())
        if not compared:
            continue
        numeric = _is_number(first.rows, column) and _is_number(second.rows, column)
        kappa = float("nan") if numeric else _kappa(cells)
        lines.append((column, compared, agreeing, 100 * agreeing / compared, kappa))
    return pd.DataFrame(lines, columns=list(AGREEMENT))


def _equal(
    a: pd.DataFrame, b: pd.DataFrame, pairs: Sequence[Pair], column: str, tolerance: float
) -> np.ndarray:
    """Whether the cells of each pair agree; two blanks do."""
    left, right = a[column].iloc[[i for i, _ in pairs]], b[column].iloc[[j for _, j in pairs]]
    if _is_number(a, column) and _is_number(b, column):
        x, y = left.to_numpy(float), right.to_numpy(float)
        room = tolerance * np.maximum(np.abs(x), np.abs(y))
        return np.asarray((np.abs(x - y) <= room) | (np.isnan(x) & np.isnan(y)))
    pairs_of_texts = zip(map(same_text, left), map(same_text, right), strict=True)
    return np.array([x == y for x, y in pairs_of_texts], dtype=bool)


def _is_number(rows: pd.DataFrame, column: str) -> bool:
    return column in NUMBER_COLUMNS or pd.api.types.is_float_dtype(rows[column].dtype)


def _kappa(cells: Sequence[tuple[object, object]]) -> float:
    """Kappa of the cells that both sheets filled; NaN when there are too many categories."""
    both = [(x, y) for a, b in cells if (x := same_text(a)) and (y := same_text(b))]
    names = sorted({text for pair in both for text in pair})
    if not names or len(names) > min(MOST_CATEGORIES, max(2, len(both) // 2)):
        return float("nan")
    codes = {name: code for code, name in enumerate(names)}
    left, right = (np.array([codes[pair[k]] for pair in both], dtype=np.int64) for k in (0, 1))
    return cohen_kappa(left, right)


def _line(first: Intake, second: Intake, i: int, j: int, column: str) -> dict[str, Any]:
    a, b = first.rows[column].iloc[i], second.rows[column].iloc[j]
    change = _change(first.rows.iloc[i], second.rows.iloc[j], column)
    return {
        **_who(first, i),
        "column": column,
        "a": _shown(a),
        "b": _shown(b),
        "cell_a": _cell(first, i, column),
        "cell_b": _cell(second, j, column),
        "difference_percent": _percent(a, b),
        "log_ratio_change": change[0],
        "standard_error_change": change[1],
        "resolution": "",
        "resolved_by": "",
    }


def _only(intake: Intake, matched: set[int], side: str) -> Iterator[dict[str, Any]]:
    """Rows without a partner."""
    for place in range(len(intake.rows)):
        if place in matched:
            continue
        row = int(intake.rows["sheet_row"].iloc[place])
        line: dict[str, Any] = dict.fromkeys(DISAGREEMENTS, "")
        line.update({name: float("nan") for name in DISAGREEMENTS[8:11]})
        yield {
            **line,
            **_who(intake, place),
            "column": WHOLE_ROW,
            "a": "there" if side == "a" else "not there",
            "b": "there" if side == "b" else "not there",
            f"cell_{side}": f"{intake.rows['sheet'].iloc[place]}, row {row}",
        }


def _who(intake: Intake, place: int) -> dict[str, str]:
    names = {"row": "row_id", "study": "study", "outcome": "outcome"}
    return {ours: _shown(intake.rows[name].iloc[place]) for ours, name in names.items()}


def _change(a: pd.Series, b: pd.Series, column: str) -> tuple[float, float]:
    """Change of log ratio and standard error of row ``a`` with one cell of row ``b``."""
    arm = next((arm for arm in arms.ARMS if column.startswith(f"{arm}_")), None)
    what = "" if arm is None else column.removeprefix(f"{arm}_")
    if what not in ("mean", "n", *SPREADS):
        return float("nan"), float("nan")
    target = f"{arm}_{'sd_value' if what in SPREADS else what}"
    mixed = a.copy()
    mixed[target] = b[target]
    before, after = _effect(a), _effect(mixed)
    return after[0] - before[0], after[1] - before[1]


SPREADS = ("sd", "spread", "spread_kind", "lower", "upper")


def _effect(row: pd.Series) -> tuple[float, float]:
    """Log ratio and its first-order standard error; NaN where they cannot be had."""
    values = {
        f"{arm}_{what}": np.array([float(row[f"{arm}_{what}"])])
        for arm in arms.ARMS
        for what in ("mean", "sd_value", "n")
    }
    thetas = []
    for arm in (arms.TREATMENT, arms.CONTROL):
        mean, n = values[f"{arm}_mean"], values[f"{arm}_n"]
        fine = (mean > 0) & (n > 0)
        mean, n = np.where(fine, mean, np.nan), np.where(fine, n, np.nan)
        thetas.append(theta((values[f"{arm}_sd_value"] / mean) ** 2, n))
    effects = first_order(values["treatment_mean"], values["control_mean"], *thetas)
    return float(effects.y[0]), float(np.sqrt(effects.v[0]))


def _percent(a: Any, b: Any) -> float:
    if not (isinstance(a, float) and isinstance(b, float)) or not a:
        return float("nan")
    return 100 * (b - a) / abs(a)


def _shown(value: Any) -> str:
    if value is None or value != value:
        return ""
    return f"{value:.12g}" if isinstance(value, float) else str(value)


def _cell(intake: Intake, place: int, column: str) -> str:
    """Address of one of our columns; the row for a moderator."""
    row = int(intake.rows["sheet_row"].iloc[place])
    letter = intake.columns[column][0] if column in intake.columns else ""
    return f"{letter}{row}" if letter else f"row {row}"
