"""Rows and arms as the later findings look at them: what stands together, what is known."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Hashable, Iterable

import numpy as np

from drystone.sheet.draft import Draft, Floats
from drystone.sheet.rounding import significant_digits
from drystone.words import arms

Numbers = tuple[float, float | None, float | None]  # mean, SD, n
DISTINCT = 3  # significant digits of a mean from which equality is hardly a coincidence
MORE_DISTINCT = 4  # of mean and SD together, where no shared arm is expected
LESS_DISTINCT = 2  # where shared arms are common


def open_rows(draft: Draft) -> list[int]:
    """Rows with a study that the team did not leave out itself."""
    studies = draft.text("study")
    return [r for r in range(draft.size) if r not in draft.left_out and studies[r] is not None]


def rows_by(draft: Draft, columns: Iterable[str]) -> dict[tuple[Hashable, ...], list[int]]:
    """Open rows by what stands in some text columns of theirs."""
    texts = [draft.text(name) for name in columns]
    found: dict[tuple[Hashable, ...], list[int]] = defaultdict(list)
    for row in open_rows(draft):
        found[tuple(text[row] for text in texts)].append(row)
    return found


def outcome_rows(draft: Draft) -> dict[str, list[int]]:
    """Open rows by outcome, for the outcomes of the config."""
    return {
        str(name): rows
        for (name,), rows in rows_by(draft, ["outcome"]).items()
        if name in draft.settings.outcomes
    }


def log_ratios(draft: Draft) -> Floats:
    """ln(treatment mean / control mean) of every row; NaN where there is none."""
    control, treatment = (draft.number(f"{arm}_mean") for arm in arms.ARMS)
    found = np.full(draft.size, np.nan)
    known = (control > 0) & (treatment > 0)
    found[known] = np.log(treatment[known]) - np.log(control[known])
    return found


def arm_numbers(draft: Draft, arm: str, row: int, digits: int = DISTINCT) -> Numbers | None:
    """Mean, SD and n of an arm, or None when they may well be another arm's by chance.

    Mean and SD together need ``digits`` significant digits; a mean without an SD needs three.
    """
    numbers, mean_digits, sd_digits = _all_arms(draft, arm)[row]
    if numbers is None or (numbers[1] is None and mean_digits < DISTINCT):
        return None
    return numbers if numbers[1] is None or mean_digits + sd_digits >= digits else None


def _all_arms(draft: Draft, arm: str) -> list[tuple[Numbers | None, int, int]]:
    """Numbers of every row's arm with the digits of mean and SD; worked out once for a sheet."""
    found = draft.worked_out.get(("arms", arm))
    if found is None:
        columns = (draft.number(f"{arm}_mean"), draft.sds[arm], draft.number(f"{arm}_n"))
        found = [_one_arm(*cells) for cells in zip(*(c.tolist() for c in columns), strict=True)]
        draft.worked_out["arms", arm] = found
    return found


def _one_arm(mean: float, sd: float, n: float) -> tuple[Numbers | None, int, int]:
    if not np.isfinite(mean) or mean == 0:
        return None, 0, 0
    mean, known = _clip(mean), _clip(sd) if sd > 0 else None
    digits = 0 if known is None else significant_digits(known)
    return (mean, known, n if n == n else None), significant_digits(mean), digits


def names_of(draft: Draft, rows: Iterable[int], shown: int = 4) -> str:
    """Row names for a sentence, the first few of them."""
    names = [str(draft.text("row_id")[row]) for row in rows]
    more = f" and {len(names) - shown} more" if len(names) > shown else ""
    return ", ".join(f"'{name[:60]}'" for name in names[:shown]) + more


def _clip(value: float) -> float:
    """Value without the last bits, which differ between file formats."""
    return float(f"{value:.12g}")
