"""Fit: reads what a strategy uses and the slice's moderators -> writes one model's results.

A model that cannot be fitted is a result too: one row with the reason, and everything else goes on.
"""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, TypeVar

import numpy as np
import pandas as pd

from drystone.maths import heterogeneity as spread
from drystone.maths.mixed_model import (
    Fit,
    Inference,
    KnownCovariance,
    Prediction,
    Prepared,
    Problem,
    Refusal,
    Term,
    cluster_robust,
    fit,
    model_based,
    prediction_interval,
    prepare,
)
from drystone.settings.formulas import is_intercept_only
from drystone.stages.design_matrix import Design, DesignProblem, design_matrix
from drystone.stages.ledger import ledger_rows
from drystone.tables.check import LEDGER
from drystone.tables.results import COEFFICIENTS, COMPONENTS, HETEROGENEITY
from drystone.tables.store import empty_table, read_table, write_table
from drystone.words.scales import CLUSTER_ROBUST, OVERALL

if TYPE_CHECKING:
    from drystone.settings.model import Analysis
    from drystone.settings.model import Inference as InferenceSettings

FEWEST_DF = 4.0
ROW_NUMBERS = re.compile(r"\b([Rr]ows?) (\d+(?:(?:, | and )\d+)*)")
Measure = TypeVar("Measure")


@dataclass(frozen=True)
class Results:
    """Tables of one model."""

    coefficients: pd.DataFrame
    components: pd.DataFrame
    heterogeneity: pd.DataFrame
    ledger: pd.DataFrame


def run(
    slice_path: Path,
    sampling_folder: Path,
    formula: str,
    analysis: Analysis,
    inference: InferenceSettings,
    target: Path,
) -> None:
    """Write coefficients, components, heterogeneity and ledger to the folder ``target``."""
    sampling = read_table(sampling_folder / "sampling.parquet")
    covariance = read_table(sampling_folder / "covariance.parquet")
    rows = sampling.merge(_moderators(slice_path, sampling), on="row_id", how="left")
    if rows.empty:
        why = _why_empty(read_table(sampling_folder / "ledger.parquet"))
        results = _refused(why, rows, _no_ledger())
    else:
        results = fit_rows(rows, covariance, formula, analysis, inference)
    write_table(results.coefficients, target / "coefficients.parquet", COEFFICIENTS)
    write_table(results.components, target / "components.parquet", COMPONENTS)
    write_table(results.heterogeneity, target / "heterogeneity.parquet", HETEROGENEITY)
    write_table(results.ledger, target / "ledger.parquet", LEDGER)


def fit_rows(
    rows: pd.DataFrame,
    covariance: pd.DataFrame,
    formula: str,
    analysis: Analysis,
    inference: InferenceSettings,
) -> Results:
    """Fit one model to ``rows`` (sampling table plus moderators); refusals become results."""
    if rows.empty:
        return _refused("no row is left under this strategy", rows, _no_ledger())
    try:
        design = design_matrix(formula, rows)
    except DesignProblem as problem:
        return _refused(str(problem), rows, _no_ledger())
    kept = rows[design.kept].reset_index(drop=True)
    blank = ledger_rows(rows[~design.kept], "blank moderator", f"blank in formula '{formula}'")
    try:
        return _fitted(kept, covariance, design, formula, analysis, inference, blank)
    except Refusal as refusal:
        return _refused(_with_ids(refusal, kept), kept, blank)


def known_covariance(rows: pd.DataFrame, covariance: pd.DataFrame) -> KnownCovariance:
    """Sampling covariance of ``rows``; pairs with a row that is not there are left out."""
    position = pd.Series(np.arange(len(rows)), index=rows["row_id"])
    i = covariance["row_id"].map(position)
    j = covariance["other_row_id"].map(position)
    both = (i.notna() & j.notna()).to_numpy()
    return KnownCovariance(
        rows["sampling_variance"].to_numpy(float),
        i[both].to_numpy(dtype=np.intp),
        j[both].to_numpy(dtype=np.intp),
        covariance["covariance"].to_numpy(float)[both],
    )


def _fitted(
    rows: pd.DataFrame,
    covariance: pd.DataFrame,
    design: Design,
    formula: str,
    analysis: Analysis,
    inference: InferenceSettings,
    ledger: pd.DataFrame,
) -> Results:
    study, _ = pd.factorize(rows["study"], sort=True)
    known = known_covariance(rows, covariance)
    effect = rows["effect"].to_numpy(float)
    terms = tuple(Term(level) for level in analysis.levels)
    problem = Problem(effect, design.matrix, design.names, study, known, terms)
    prepared = prepare(problem)
    fitted = fit(prepared, inference.estimator)
    alone = is_intercept_only(formula) and design.names == (OVERALL,)
    table = _coefficients(prepared, fitted, inference, alone)
    return Results(table, _components(prepared, fitted), _spread(prepared, fitted, alone), ledger)


def _coefficients(
    prepared: Prepared, fitted: Fit, inference: InferenceSettings, alone: bool
) -> pd.DataFrame:
    level = inference.confidence_percent
    beside = model_based(fitted, confidence_percent=level)
    robust = inference.interval == CLUSTER_ROBUST
    main = cluster_robust(prepared, fitted).infer(confidence_percent=level) if robust else beside
    new = prediction_interval(fitted, confidence_percent=level) if alone else None
    table = pd.DataFrame({"coefficient": fitted.coefficient_names})
    table["estimate"] = fitted.coefficients
    _put(table, main, "")
    _put(table, beside, "_model")
    table["p"] = main.p
    table["pi_low"], table["pi_high"] = _limits(new)
    table["rows"], table["studies"] = fitted.rows, fitted.studies
    table["log_likelihood"] = fitted.log_likelihood
    table["refused"] = None
    table["warnings"] = "\n".join(_warnings(fitted, main)) or None
    return table


def _put(table: pd.DataFrame, found: Inference, suffix: str) -> None:
    table[f"se{suffix}"] = found.standard_errors
    table[f"df{suffix}"] = found.degrees_of_freedom
    table[f"ci_low{suffix}"], table[f"ci_high{suffix}"] = found.low, found.high


def _limits(new: Prediction | None) -> tuple[float, float]:
    if new is None:
        return np.nan, np.nan
    return float(new.low[0]), float(new.high[0])


def _warnings(fitted: Fit, main: Inference) -> list[str]:
    found = []
    few = float(np.min(main.degrees_of_freedom))
    if few < FEWEST_DF:
        found.append(
            f"Too few studies for a firm interval: {few:.2f} degrees of freedom; below 4 the "
            "interval and the p value are rough."
        )
    for name in fitted.components:
        if fitted.at_zero.get(name):
            found.append(f"The variance between units of level '{name}' is estimated as zero.")
    if not fitted.certificate.starts_agree:
        found.append("Several searches for the variance components ended at different places.")
    return found


def _components(prepared: Prepared, fitted: Fit) -> pd.DataFrame:
    shares = _or_none(spread.shares, prepared, fitted)
    parts = shares.by_level if shares else {}
    table = pd.DataFrame({"level": list(fitted.components)})
    table["variance"] = list(fitted.components.values())
    table["at_zero"] = [bool(fitted.at_zero[name]) for name in fitted.components]
    table["i2"] = [parts.get(name, np.nan) for name in fitted.components]
    return table


def _spread(prepared: Prepared, fitted: Fit, alone: bool) -> pd.DataFrame:
    row: dict[str, float] = {}
    if test := _or_none(spread.homogeneity_test, prepared):
        row |= {"q": test.q, "q_df": float(test.degrees_of_freedom), "q_p": test.p}
    if parts := _or_none(spread.shares, prepared, fitted):
        row |= {"typical_variance": parts.typical_variance, "i2_total": parts.total}
    relative = _or_none(spread.relative_spread, prepared, fitted) if alone else None
    if relative:
        row |= {"cvh": relative.cvh1, "m": relative.m1}
    explained = None if alone else _or_none(spread.explained, prepared, fitted)
    if explained:
        row |= {"r2_marginal": explained.marginal, "r2_conditional": explained.conditional}
    return pd.DataFrame([{name: row.get(name, np.nan) for name in HETEROGENEITY.columns}])


def _or_none(measure: Callable[..., Measure], *given: Prepared | Fit) -> Measure | None:
    """A measure that these rows do not allow (such as Q under a singular V) stays blank."""
    try:
        return measure(*given)
    except Refusal:
        return None


def _why_empty(ledger: pd.DataFrame) -> str:
    """Why a strategy has no row: the ledger's reason when it is one for all."""
    reasons = ledger["reason"].unique()
    return str(reasons[0]) if len(reasons) == 1 else "no row is left under this strategy"


def _refused(reason: str, rows: pd.DataFrame, ledger: pd.DataFrame) -> Results:
    row = dict.fromkeys(COEFFICIENTS.columns, np.nan) | {
        "coefficient": OVERALL,
        "rows": len(rows),
        "studies": int(rows["study"].nunique()),
        "refused": reason,
        "warnings": None,
    }
    return Results(pd.DataFrame([row]), empty_table(COMPONENTS), empty_table(HETEROGENEITY), ledger)


def _with_ids(refusal: Refusal, rows: pd.DataFrame) -> str:
    """Sentence of the refusal with the engine's row numbers turned into the review's row ids."""
    if "rows" not in refusal.facts:
        return refusal.sentence

    def named(match: re.Match[str]) -> str:
        numbers = [int(number) for number in re.findall(r"\d+", match[2])]
        ids = [str(rows["row_id"].iloc[number]) for number in numbers if number < len(rows)]
        return f"{match[1]} {', '.join(ids)}"

    return ROW_NUMBERS.sub(named, refusal.sentence)


def _moderators(slice_path: Path, sampling: pd.DataFrame) -> pd.DataFrame:
    rows = read_table(slice_path)
    return rows[["row_id", *(name for name in rows.columns if name not in sampling.columns)]]


def _no_ledger() -> pd.DataFrame:
    return empty_table(LEDGER)
