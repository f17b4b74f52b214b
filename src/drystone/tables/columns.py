"""Short constructors for pandera columns that carry a description, a unit and their use."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pandera.pandas as pa

NUMBERS = "numbers"  # decides a result: an edit reruns the analyses that hold the row
RECORD = "record"  # kept for people: an edit reruns the check only


def text(
    description: str,
    *,
    required: bool = False,
    allowed: Sequence[str] | None = None,
    use: str = NUMBERS,
    group: str = "result",
) -> pa.Column:
    """Text column; ``allowed`` lists the values that a cell may hold."""
    checks = [pa.Check.isin(list(allowed))] if allowed else []
    return _column(str, description, checks, required, use, group, {"allowed": list(allowed or [])})


def number(
    description: str,
    *,
    unit: str = "",
    required: bool = False,
    at_least: float | None = None,
    use: str = NUMBERS,
    group: str = "result",
) -> pa.Column:
    """Number column (float64); ``at_least`` is the smallest value that makes sense."""
    checks = [] if at_least is None else [pa.Check.ge(at_least)]
    return _column(float, description, checks, required, use, group, {"unit": unit})


def whole(description: str, *, required: bool = True, group: str = "result") -> pa.Column:
    """Whole-number column (int64), never blank."""
    return _column("int64", description, [], required, NUMBERS, group, {})


def flag(description: str, *, group: str = "result") -> pa.Column:
    """True or false, never blank."""
    return _column(bool, description, [], True, NUMBERS, group, {})


def schema(name: str, one_row: str, columns: dict[str, pa.Column]) -> pa.DataFrameSchema:
    """Schema that refuses unknown columns; ``one_row`` says what a row stands for."""
    return pa.DataFrameSchema(
        columns, name=name, description=f"one row = {one_row}", strict=True, ordered=False
    )


def _column(
    dtype: Any,
    description: str,
    checks: list[pa.Check],
    required: bool,
    use: str,
    group: str,
    extra: dict[str, Any],
) -> pa.Column:
    metadata = {"use": use, "group": group, **extra}
    return pa.Column(
        dtype,
        checks=checks,
        nullable=not required,
        coerce=True,
        description=description,
        metadata=metadata,
    )
