"""Can the rows tell the levels apart at all? Answered before any search.

Two components are told apart by the contrasts of the rows that are free of the coefficients. With
P the projection onto those contrasts, tr(P G_k P G_l) is the Gram matrix of the levels there: a
zero on its diagonal is a level about which the rows say nothing, a correlation of one a pair of
levels that act alike (own derivation).
"""

from dataclasses import replace
from typing import NoReturn

import numpy as np

from drystone.maths.mixed_model.criterion import Estimator, Evaluation, evaluate
from drystone.maths.mixed_model.derivatives import expected_information
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import ROW, SCALE, STUDY, Floats, Ints
from drystone.maths.mixed_model.refuse import (
    FlatLikelihoodError,
    LevelsIndistinguishableError,
    SingularCovarianceError,
)

#: Correlations this close to one, and shares this small, are rounding error.
SAME = 1e-9
#: Curvature, relative to that of each component alone, that is rounding error.
FLAT = 1e-10
#: Residuals below this share of the largest response are rounding error.
ROUNDING = 1e-13


def check_identified(prepared: Prepared) -> None:
    """Refuse levels that no amount of searching could estimate.

    Raises
    ------
    LevelsIndistinguishableError
        If a set of levels acts alike on the rows, such as study and row with one row per study.
    FlatLikelihoodError
        If the coefficients absorb a level completely.
    """
    names = prepared.term_names
    if not names:
        return
    plain, at = _at_unit_covariance(prepared)
    gram = expected_information(plain, at, "REML")
    free = expected_information(plain, at, "ML")
    size = np.diag(gram)
    absorbed = [name for k, name in enumerate(names) if size[k] <= SAME * free[k, k]]
    if absorbed:
        raise FlatLikelihoodError(
            f"The coefficients leave nothing to estimate the level '{absorbed[0]}' from.",
            levels=absorbed,
        )
    scale = np.sqrt(size)
    values, vectors = np.linalg.eigh(gram / np.outer(scale, scale))
    if values[0] <= SAME:
        _refuse_alike([name for k, name in enumerate(names) if abs(vectors[k, 0]) > 1e-3], prepared)


def check_bounded(prepared: Prepared, estimator: Estimator) -> None:
    """Refuse perfectly correlated rows whose responses agree perfectly.

    A row level at zero then has infinite likelihood: the rows are copies of each other. Where they
    disagree, a row level above zero is needed and there is no harm.

    Raises
    ------
    SingularCovarianceError
        If the likelihood has no upper bound; names the rows.
    """
    _check_scale_bounded(prepared)
    null = np.flatnonzero((prepared.rotation.variances == 0.0) & (np.abs(prepared.ones) < SAME))
    if not len(null):
        return
    design, response = prepared.basis[:, null].T, prepared.response[null]
    fitted, _, rank, _ = np.linalg.lstsq(design, response, rcond=SAME)
    left = np.linalg.norm(response - design @ fitted)
    carried = rank if estimator == "REML" else 0
    if len(null) > carried and left <= SAME * np.linalg.norm(prepared.response):
        rows = _rows_of_blocks(prepared, null)
        raise SingularCovarianceError(
            f"Rows {', '.join(map(str, rows))} are perfectly correlated and agree perfectly: "
            "they are copies of each other, and the likelihood has no maximum.",
            rows=rows,
        )


def _check_scale_bounded(prepared: Prepared) -> None:
    exact = np.abs(prepared.response).max() <= ROUNDING * np.abs(prepared.problem.y).max()
    if SCALE in prepared.term_names and exact:
        raise SingularCovarianceError(
            "Every row lies exactly on its fitted value, so a factor of the sampling variances "
            "runs to zero and the likelihood has no maximum."
        )


def _rows_of_blocks(prepared: Prepared, places: Ints) -> list[int]:
    """Caller's row numbers of the rotated blocks that hold `places`."""
    held = [block for rows in prepared.rotation.members for block in rows]
    touched = [block for block in held if np.isin(block, places).any()]
    return sorted(int(row) for block in touched for row in prepared.order[block])


def _at_unit_covariance(prepared: Prepared) -> tuple[Prepared, Evaluation]:
    """The same rows with independent errors of variance one, and no level yet."""
    plain = replace(prepared, base=np.ones_like(prepared.base))
    at = evaluate(plain, np.zeros(len(prepared.term_names)), "REML")
    assert at is not None  # a unit covariance always has an inverse
    return plain, at


def _refuse_alike(names: list[str], prepared: Prepared) -> NoReturn:
    joined = " and ".join(names)
    why = {
        frozenset({STUDY, ROW}): "one row per study",
        frozenset({SCALE, ROW}): "all sampling variances are alike",
    }.get(frozenset(names), "they act alike on every contrast of the rows")
    if frozenset(names) == {STUDY, ROW} and prepared.studies < prepared.rows:
        why = "they act alike on every contrast that the coefficients leave free"
    raise LevelsIndistinguishableError(f"{joined} cannot be told apart: {why}.", levels=names)


def invert_information(information: Floats, names: list[str]) -> Floats:
    """Inverse of the information, or a refusal where the likelihood has no curvature.

    Raises
    ------
    FlatLikelihoodError
        If some combination of the components can change without changing the likelihood.
    """
    size = np.sqrt(np.maximum(np.diag(information), 0.0))
    scaled = information / np.outer(size, size) if size.all() else np.zeros_like(information)
    if np.linalg.eigvalsh(scaled)[0] <= FLAT:
        raise FlatLikelihoodError(
            f"The likelihood is flat at its maximum: {' and '.join(names)} cannot be estimated.",
            levels=names,
        )
    inverse: Floats = np.linalg.inv(scaled) / np.outer(size, size)
    return inverse
