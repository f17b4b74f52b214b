"""One way from typed cells to an SD: what goes in, by which formula, and what speaks against it."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Generic, TypeVar

import numpy as np
import numpy.typing as npt

Floats = npt.NDArray[np.float64]
Mask = npt.NDArray[np.bool_]
Refusals = Iterator[tuple[str, Mask]]


@dataclass(frozen=True)
class ArmNumbers:
    """Numbers of one arm, an entry for every row; NaN where missing.

    Parameters
    ----------
    mean : as typed, whatever centre it is
    is_median : whether that centre is a median
    """

    mean: Floats
    n: Floats
    spread: Floats
    lower: Floats
    upper: Floats
    q1: Floats
    q3: Floats
    min: Floats
    max: Floats
    confidence_percent: Floats
    is_median: Mask


@dataclass(frozen=True)
class PairNumbers:
    """Numbers of a comparison as a whole, an entry for every row; NaN where missing.

    Parameters
    ----------
    test_df : degrees of freedom of a test of the difference: typed ones, or n1 + n2 - 2 where the
        arms are independent
    on_logs : whether both means are means of logarithms
    """

    control_mean: Floats
    control_n: Floats
    treatment_mean: Floats
    treatment_n: Floats
    pooled_spread: Floats
    difference_lower: Floats
    difference_upper: Floats
    grand_mean: Floats
    number_of_means: Floats
    error_df: Floats
    confidence_percent: Floats
    test_value: Floats
    test_df: Floats
    on_logs: Mask


Numbers = TypeVar("Numbers", ArmNumbers, PairNumbers)


def never_refused(numbers: ArmNumbers | PairNumbers) -> Refusals:
    """Nothing speaks against this conversion."""
    yield from ()


def spread_given(arm: ArmNumbers) -> Mask:
    """Rows with a spread that is not negative."""
    return ~np.isnan(arm.spread) & (arm.spread >= 0)


def given(*columns: Floats) -> Mask:
    """Rows in which none of ``columns`` is missing."""
    return ~np.isnan(np.sum(columns, axis=0)) | np.isinf(np.sum(columns, axis=0))


def usable_level(numbers: ArmNumbers | PairNumbers) -> Mask:
    """Rows whose confidence level can be one."""
    return (numbers.confidence_percent >= 50) & (numbers.confidence_percent < 100)


@dataclass(frozen=True)
class Conversion(Generic[Numbers]):
    """One way from typed cells to an SD.

    Parameters
    ----------
    rule : name in derivations and in the rows' SD rule
    inputs : columns that go in, without the arm's name; findings point to the first
    formula, assumption : in words
    convert : the formula, for all rows at once
    given : rows that have the inputs
    refused : reasons not to convert, with the rows that they hold for
    needs : columns of the comparison without which it cannot be done
    centre : the mean that is found along with the SD, NaN where the typed one stays
    of_geometric_mean : whether it belongs to a geometric mean; its SD is one of natural logarithms
    """

    rule: str
    inputs: tuple[str, ...]
    formula: str
    assumption: str
    convert: Callable[[Numbers], Floats]
    given: Callable[[Numbers], Mask]
    refused: Callable[[Numbers], Refusals] = never_refused
    needs: tuple[str, ...] = ()
    centre: Callable[[Numbers], Floats] | None = None
    of_geometric_mean: bool = False
