"""SDs that look like standard errors, standard errors that look like SDs, CVs far out."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import dataclass

import numpy as np

from drystone.maths import spread_screen as screen
from drystone.sheet.draft import Draft, Floats
from drystone.sheet.findings.groups import outcome_rows
from drystone.sheet.findings.meanings import stopped_outcomes
from drystone.sheet.notes import Note
from drystone.words import arms, levels

FROM_SE = "from SE"
AS_TYPED = "as typed"
LIKELIER = math.log(150.0)  # very strong: Kass and Raftery 1995, J Am Stat Assoc 90:773 (memory)
CENTRAL = 2.5  # SDs from the outcome's middle within which the other reading must fall
Ratio = Callable[[Floats, Floats, Floats, Floats, np.ndarray], Floats]
FAR, CHANCE = 2.5, 1e-3


@dataclass(frozen=True)
class _Arms:
    """Arms with an SD of one outcome, an entry for each."""

    row: np.ndarray
    column: np.ndarray  # 0 control, 1 treatment
    study: np.ndarray  # counted from 0
    log_cv: Floats
    n: Floats
    location: Floats
    scale: Floats

    @property
    def spread(self) -> Floats:
        """SD of ln CV among such arms, sampling error included."""
        return np.sqrt(self.scale**2 + screen.log_sd_variance(self.n))

    @property
    def away(self) -> Floats:
        """Distance from the middle in these SDs."""
        return (self.log_cv - screen.log_sd_bias(self.n) - self.location) / self.spread


def screen_spreads(draft: Draft) -> Iterator[Note]:
    """Compare every SD with those that other studies report for the outcome."""
    stopped = stopped_outcomes(draft)
    for name, rows in outcome_rows(draft).items():
        found = None if name in stopped else _arms(draft, rows)
        if found is None:
            continue
        told: set[tuple[int, int]] = set()
        for mixed_up in (_se_for_sd(draft, name, found), _sd_for_se(draft, name, found)):
            for place, note in mixed_up:
                told.add(place)
                yield note
        yield from _far_out(draft, name, found, told)


def _arms(draft: Draft, rows: list[int]) -> _Arms | None:
    parts = []
    for which, arm in enumerate(arms.ARMS):
        mean, n = draft.number(f"{arm}_mean")[rows], draft.number(f"{arm}_n")[rows]
        sd = draft.sds[arm][rows]
        with np.errstate(all="ignore"):
            log_cv = np.log(sd) - np.log(mean)
        known = np.flatnonzero((mean > 0) & (sd > 0) & (n >= 2) & np.isfinite(log_cv))
        parts.append((np.array(rows)[known], np.full(known.size, which), log_cv[known], n[known]))
    row, column, log_cv, n = (np.concatenate(part) for part in zip(*parts, strict=True))
    if row.size == 0:
        return None
    names = [str(draft.text("study")[at]) for at in row]
    studies = np.unique(names, return_inverse=True)[1]
    noise = screen.log_sd_variance(n)
    near = screen.reference(log_cv - screen.log_sd_bias(n), noise, studies)
    ok = ~np.isnan(near.scale)
    if not ok.any():
        return None
    return _Arms(
        row[ok], column[ok], studies[ok], log_cv[ok], n[ok], near.location[ok], near.scale[ok]
    )


def _se_for_sd(draft: Draft, name: str, found: _Arms) -> Iterator[tuple[tuple[int, int], Note]]:
    moved = found.away + 0.5 * np.log(found.n) / found.spread
    for at, factor in _likely(draft, found, screen.log_ratio_se, moved, AS_TYPED):
        arm, row = arms.ARMS[int(found.column[at])], int(found.row[at])
        sd = float(draft.sds[arm][row])
        column = f"{arm}_sd" if not np.isnan(draft.number(f"{arm}_sd")[row]) else f"{arm}_spread"
        yield (
            (row, int(found.column[at])),
            draft.note(
                levels.WARN,
                "SE taken for SD",
                column,
                row,
                f"an SD of {sd:.4g} is a CV of {_percent(found.log_cv[at])}, while "
                f"{_percent(found.location[at])} is typical of '{name}'; as a standard error it "
                f"would give the SD {sd * math.sqrt(found.n[at]):.4g}, "
                f"{_times(factor)} as likely for the study's arms; nothing was changed",
                "look in the paper what the spread is; if a standard error, move it to "
                f"{arm}_spread and type SE as its kind",
            ),
        )


def _sd_for_se(draft: Draft, name: str, found: _Arms) -> Iterator[tuple[tuple[int, int], Note]]:
    moved = found.away - 0.5 * np.log(found.n) / found.spread
    for at, factor in _likely(draft, found, screen.log_ratio_sd, moved, FROM_SE):
        arm, row = arms.ARMS[int(found.column[at])], int(found.row[at])
        typed = float(draft.number(f"{arm}_spread")[row])
        yield (
            (row, int(found.column[at])),
            draft.note(
                levels.WARN,
                "SD taken for SE",
                f"{arm}_spread",
                row,
                f"the standard error gives a CV of {_percent(found.log_cv[at])}, while "
                f"{_percent(found.location[at])} is typical of '{name}'; {typed:.4g} as an SD is "
                f"{_times(factor)} as likely for the study's arms; nothing was changed",
                f"look in the paper what the spread is; if an SD, type SD as {arm}_spread_kind",
            ),
        )


def _likely(
    draft: Draft, found: _Arms, ratio: Ratio, moved: Floats, rule: str
) -> Iterator[tuple[int, float]]:
    """Arms of studies that as a whole speak for the other reading, with the study's log ratio.

    Of such a study, the rows whose every arm speaks for it too and would then look usual.
    """
    pairs = zip(found.row, found.column, strict=True)
    at = np.flatnonzero([draft.sd_rules[arms.ARMS[c]][r] == rule for r, c in pairs])
    if at.size == 0:
        return
    given = (found.log_cv[at], found.n[at], found.location[at], found.scale[at])
    alone = ratio(*given, np.arange(at.size))
    study = _study_ratios(found.study[at], ratio, given)
    good = (alone > 0) & (np.abs(moved[at]) < CENTRAL) & (study > LIKELIER)
    bad_rows = set(found.row[at][~good])
    for place, factor in zip(at, study, strict=True):
        if int(found.row[place]) not in bad_rows:
            yield int(place), float(factor)


def _study_ratios(
    studies: np.ndarray, ratio: Ratio, given: tuple[Floats, Floats, Floats, Floats]
) -> Floats:
    """Log ratio of each arm's study, from its different arms: a shared one counts once."""
    seen = np.round(np.column_stack([studies, given[0], np.log(given[1])]), 9)
    _, kept = np.unique(seen, axis=0, return_index=True)
    kept = kept[np.argsort(studies[kept], kind="stable")]
    names, block = np.unique(studies[kept], return_inverse=True)
    log_cv, n, location, scale = (part[kept] for part in given)
    found = ratio(log_cv, n, location, scale, block)
    return np.asarray(found[np.searchsorted(names, studies)])


def _far_out(draft: Draft, name: str, found: _Arms, told: set[tuple[int, int]]) -> Iterator[Note]:
    given = (found.log_cv, found.n, found.location, found.scale, FAR)
    low, high = screen.too_small(*given) < CHANCE, screen.too_large(*given) < CHANCE
    for at in np.flatnonzero(low | high):
        row, place = int(found.row[at]), int(found.column[at])
        if (row, place) in told:
            continue
        arm = arms.ARMS[place]
        column = f"{arm}_sd" if not np.isnan(draft.number(f"{arm}_sd")[row]) else f"{arm}_spread"
        yield draft.note(
            levels.WARN,
            "CV far out",
            column,
            row,
            f"the SD is {_percent(found.log_cv[at])} of the mean, while "
            f"{_percent(found.location[at])} is typical of '{name}'",
            "compare spread, its kind and the decimal point with the paper",
        )


def _percent(log_cv: float) -> str:
    return f"{100 * math.exp(min(max(float(log_cv), -300.0), 300.0)):.3g} %"


def _times(log_factor: float) -> str:
    factor = math.exp(min(log_factor, 20.0))
    return f"{factor:.0f} times" if factor < 1000 else "over 1000 times"
