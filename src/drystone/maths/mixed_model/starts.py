"""Where searches for the maximum begin."""

import numpy as np

from drystone.maths.mixed_model.prepare import Prepared
from drystone.maths.mixed_model.problem import ROW, SCALE, STUDY, Floats

#: Up to this many rows every start is tried; above, the first two.
SMALL = 1000


def distinct(starts: list[Floats]) -> list[Floats]:
    """Starts without repetitions, in order."""
    return [start for k, start in enumerate(starts) if not _seen(start, starts[:k])]


def _seen(start: Floats, others: list[Floats]) -> bool:
    return any(np.array_equal(start, other) for other in others)


def own_starts(prepared: Prepared) -> list[Floats]:
    """Splits of the ordinary least-squares excess variance, and a row level that starts tiny.

    Unlike variances or strong known correlations can give the likelihood a second maximum at row
    variances of the size of the smallest eigenvalue of V, which only a climb from below finds.
    """
    free = prepared.rows - prepared.width
    variances = prepared.rotation.variances
    noise = (variances.sum() - (prepared.basis**2 @ variances).sum()) / free
    spread = float(prepared.response @ prepared.response) / free
    excess = max(spread - noise, 0.05 * spread, 1e-3 * noise)
    tiny = max(float(variances.min()), 1e-12 * noise)
    levels = [(0.5, 0.5), (0.95, tiny / excess), (0.95, 0.05), (0.05, 0.95), (2.0, 2.0)]
    if prepared.rows > SMALL:
        levels = levels[:2]
    return [_start(prepared, excess * study, excess * row) for study, row in levels]


def _start(prepared: Prepared, study: float, row: float) -> Floats:
    values = {STUDY: study, ROW: row, SCALE: 1.0}
    if ROW not in prepared.term_names:
        values[STUDY] += row
    return np.array([values[name] for name in prepared.term_names])
