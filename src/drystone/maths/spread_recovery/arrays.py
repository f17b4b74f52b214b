"""Arrays of the formulas in this folder: float64, shape (k,) or broadcast to it, NaN = missing."""

from __future__ import annotations

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]


def floats(values: npt.ArrayLike) -> Floats:
    """``values`` as a float64 array."""
    return np.asarray(values, dtype=np.float64)


def only_where(condition: npt.ArrayLike, values: npt.ArrayLike) -> Floats:
    """``values`` where ``condition`` holds, NaN elsewhere: numbers that cannot be are missing."""
    return np.asarray(np.where(condition, values, np.nan), dtype=np.float64)


def quiet() -> np.errstate:
    """Context in which numbers that cannot be turn into NaN or infinity without a warning."""
    return np.errstate(invalid="ignore", over="ignore", divide="ignore", under="ignore")
