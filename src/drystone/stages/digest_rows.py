"""Digest of a table's content: bits of numbers, characters of text, nothing of its formatting."""

from __future__ import annotations

import hashlib

import numpy as np
import pandas as pd

UNIT, RECORD = "\x1f", "\x1e"


def digest_table(table: pd.DataFrame) -> str:
    """Digest of columns and rows in their order; 19 and 19.000 are the same number.

    Raises nothing for any table that can be turned into text.
    """
    total = hashlib.sha256()
    for name in table.columns:
        total.update(f"{name}{RECORD}".encode())
        total.update(_column_bytes(table[name]))
    return total.hexdigest()[:20]


def _column_bytes(column: pd.Series) -> bytes:
    if pd.api.types.is_float_dtype(column.dtype) or pd.api.types.is_integer_dtype(column.dtype):
        numbers = column.to_numpy(dtype="<f8", na_value=np.nan) + 0.0  # -0.0 becomes 0.0
        numbers = np.where(np.isnan(numbers), np.nan, numbers)  # one kind of blank
        return numbers.astype("<f8").tobytes()
    blank = column.isna().to_numpy()
    texts = ["\0" if empty else str(value) for value, empty in zip(column, blank, strict=True)]
    return UNIT.join(texts).encode("utf-8", "surrogatepass")
