"""Score and information of the components.

With P = inverse(Sigma) - inverse(Sigma) X inverse(X' inverse(Sigma) X) X' inverse(Sigma) and
G_k = d Sigma / d theta_k (Gilmour, Thompson & Cullis 1995, Biometrics 51:1440-1450):

    score_k          = -tr(P G_k) / 2 + y' P G_k P y / 2
    average_kl       = y' P G_k P G_l P y / 2
    expected_kl      = tr(P G_k P G_l) / 2
    observed         = 2 average - expected

For ML the traces are those of inverse(Sigma) in place of P.
"""

from dataclasses import dataclass

import numpy as np

from drystone.maths.mixed_model.criterion import (
    Estimator,
    Evaluation,
    Weights,
    unwhiten,
    whiten,
)
from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import Floats


@dataclass(frozen=True)
class Slope:
    """First derivatives and the average information.

    Parameters
    ----------
    score : array, shape (q,)
        Derivatives of the log-likelihood.
    half_traces : array, shape (q,)
        tr(P G_k) / 2: the scale on which a score is small or large.
    average : array, shape (q, q)
        Average information.
    """

    score: Floats
    half_traces: Floats
    average: Floats

    def imbalance(self) -> Floats:
        """Scores relative to their two parts; at a maximum only rounding error is left."""
        scale = np.where(self.half_traces > 0.0, self.half_traces, 1.0)
        return self.score / scale


def slope(prepared: Prepared, at: Evaluation, estimator: Estimator) -> Slope:
    """Score and average information at an evaluation, in O(K p)."""
    weights = at.weights
    pulled = unwhiten(prepared, weights, at.white_residual[None])[0]
    by_study = at.white_residual[prepared.rows :] * weights.between_root
    quadratics = _quadratics(prepared, pulled, by_study)
    half_traces = 0.5 * _traces(prepared, weights)
    if estimator == "REML":
        half_traces = half_traces - 0.5 * _trace_corrections(prepared, at)
    white = _white_forces(prepared, weights, pulled, by_study)
    along = white @ at.white_basis.T
    average = 0.5 * (white @ white.T - along @ along.T)
    return Slope(0.5 * quadratics - half_traces, half_traces, average)


def expected_information(prepared: Prepared, at: Evaluation, estimator: Estimator) -> Floats:
    """Expected information of the components, shape (q, q)."""
    traces = _double_traces(prepared, at.weights)
    if estimator == "REML":
        traces = traces + _double_trace_corrections(prepared, at)
    return 0.5 * traces


def _spread(prepared: Prepared, diagonal: Floats, study: Floats | float) -> Floats:
    """Put per-level values, diagonal levels and the study level, into the order of the terms."""
    if prepared.study_term is None:
        return diagonal
    made = np.empty((len(diagonal) + 1, *diagonal.shape[1:]))
    made[list(prepared.diagonal_terms)] = diagonal
    made[prepared.study_term] = study
    return made


def _quadratics(prepared: Prepared, pulled: Floats, by_study: Floats) -> Floats:
    return _spread(prepared, prepared.slopes @ pulled**2, by_study @ by_study)


def _traces(prepared: Prepared, weights: Weights) -> Floats:
    """tr(inverse(Sigma) G_k); the diagonal of the inverse is written without a difference."""
    own = prepared.ones * weights.pulled
    others = weights.mass[prepared.segment] - own
    kept = weights.shrink[prepared.segment] * (1.0 + weights.between_variance * others)
    study = weights.between_root @ weights.between_root
    return _spread(prepared, prepared.slopes @ (weights.precision * kept), study)


def _trace_corrections(prepared: Prepared, at: Evaluation) -> Floats:
    pulled = unwhiten(prepared, at.weights, at.white_basis)
    by_study = at.white_basis[:, prepared.rows :] * at.weights.between_root
    return _spread(prepared, prepared.slopes @ (pulled**2).sum(axis=0), (by_study**2).sum())


def _white_forces(prepared: Prepared, weights: Weights, pulled: Floats, by_study: Floats) -> Floats:
    """White coordinates of G_k P y, shape (q, K + J)."""
    white = whiten(prepared, weights, prepared.slopes * pulled)
    study = np.concatenate([np.zeros(prepared.rows), weights.between_root * by_study])
    return _spread(prepared, white, study)


def _double_traces(prepared: Prepared, weights: Weights) -> Floats:
    """tr(inverse(Sigma) G_k inverse(Sigma) G_l)."""
    s, h = weights.between_variance, weights.shrink
    slopes, precision = prepared.slopes, weights.precision
    pulled = prepared.sum_by_study(slopes * weights.pulled**2)
    scaled = slopes * precision
    # |inverse|^2 summed over a study = sum 1/m^2 - 2 s h sum z^2/m^3 + (s h)^2 (sum z^2/m^2)^2
    own = 1.0 - 2.0 * (s * h)[prepared.segment] * prepared.ones * weights.pulled
    double = (scaled * own) @ scaled.T + (pulled * (s * h) ** 2) @ pulled.T
    if prepared.study_term is None:
        return double
    cross = pulled @ h**2
    study = weights.between_root**2
    rows = _spread(prepared, np.column_stack([double, cross]), np.append(cross, study @ study))
    return _spread(prepared, rows.T[:-1], rows.T[-1])


def _double_trace_corrections(prepared: Prepared, at: Evaluation) -> Floats:
    """-2 tr(E G_k inverse(Sigma) G_l E') + tr(B_k B_l) with E = white basis on the row side."""
    pulled = unwhiten(prepared, at.weights, at.white_basis)
    by_study = at.white_basis[:, prepared.rows :] * at.weights.between_root
    forces = np.stack(
        [_white_forces(prepared, at.weights, e, f) for e, f in zip(pulled, by_study, strict=True)]
    )
    inner = np.einsum("akn,aln->kl", forces, forces)
    products = np.einsum("akn,bn->kab", forces, at.white_basis)
    corrections: Floats = np.einsum("kab,lba->kl", products, products) - 2.0 * inner
    return corrections
