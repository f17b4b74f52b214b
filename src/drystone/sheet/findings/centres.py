"""Centres that are no arithmetic means: which become one, and which are asked about.

A ratio of means needs the same kind of mean in both arms, so logarithms are turned back in both
arms of a row or in none:

- means of logarithms with their SDs become means and SDs of the values (log-normal; Higgins et al.
  2008), and so does a geometric mean whose confidence limits are centred on the log scale;
- where an arm of the row lacks the SD of logarithms, geometric means stay, or take the place of
  means of logarithms, and both SDs count as missing: the ratio is then one of geometric means;
- a mean of logarithms beside a centre of another kind is a typing mistake, and the row leaves;
- medians are settled with their quartiles; one without them is used as it is, and asked about.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from drystone.maths import spread_recovery as recover
from drystone.maths.spread_recovery.log_scale import LN_10
from drystone.sheet.derive import derive, input_words
from drystone.sheet.draft import Draft, Floats, Mask, where
from drystone.sheet.findings.words import each_typed
from drystone.sheet.notes import Note
from drystone.words import arms, levels, spreads


@dataclass(frozen=True)
class _LogArm:
    """One arm on the log scale; NaN and False where its centre is an ordinary one.

    Parameters
    ----------
    typed_logs : whether logarithms are typed, not a geometric mean
    log_mean, log_sd : of natural logarithms
    mean, sd : of the values
    """

    typed_logs: Mask
    log_mean: Floats
    log_sd: Floats
    mean: Floats
    sd: Floats

    @property
    def concerned(self) -> Mask:
        return ~np.isnan(self.log_mean)

    @property
    def ready(self) -> Mask:
        """Whether mean and SD of the values can be had."""
        usable = np.isfinite(self.mean) & (self.mean > 0) & np.isfinite(self.sd) & (self.sd > 0)
        return usable & np.isfinite(self.log_sd)


def settle_centres(draft: Draft) -> Iterator[Note]:
    """Turn logarithms back; ask about centres that stay what they are."""
    found = {arm: _log_arm(draft, arm) for arm in arms.ARMS}
    stray = _stray(draft, found)
    for arm in arms.ARMS:
        lone = where(stray & found[arm].typed_logs)
        yield from each_typed(
            draft,
            levels.STOP,
            "mean of logs",
            f"{arm}_centre_kind",
            lone,
            "the centre is a mean of logarithms but that of the other arm is not, so the two make "
            "no ratio",
            "choose the kind of both centres, and type both on one scale",
        )
    ready = np.logical_and.reduce([one.ready | ~one.concerned for one in found.values()])
    for arm, one in found.items():
        rows = one.concerned & ~stray
        yield from _turn_back(draft, arm, one, where(rows & ready))
        yield from _without_sd(draft, arm, one, where(rows & ~ready))
    for arm in arms.ARMS:
        yield from _no_mean(draft, arm)


def _log_arm(draft: Draft, arm: str) -> _LogArm:
    kinds, typed, sds = (
        draft.text(f"{arm}_centre_kind"),
        draft.number(f"{arm}_mean"),
        draft.sds[arm],
    )
    geometric = np.asarray(kinds == spreads.GEOMETRIC_MEAN) & (typed > 0)
    logs = np.isin(kinds, spreads.LOG_CENTRES) & ~np.isnan(typed)
    base = np.where(kinds == spreads.MEAN_OF_LOG10, LN_10, 1.0)
    with np.errstate(over="ignore"):
        log_mean = np.where(logs, typed * base, np.nan)
        log_sd = np.where(logs, sds * base, np.where(geometric, sds, np.nan))
    log_mean[geometric] = np.log(typed[geometric])
    values = recover.from_log(log_mean, log_sd)
    return _LogArm(logs, log_mean, log_sd, values.mean, values.sd)


def _stray(draft: Draft, found: dict[str, _LogArm]) -> Mask:
    """Rows with a mean of logarithms in one arm and an ordinary centre in the other."""
    one, other = found[arms.CONTROL], found[arms.TREATMENT]
    means = [~np.isnan(draft.number(f"{arm}_mean")) for arm in arms.ARMS]
    known = means[0] & means[1]
    lone = (one.typed_logs & ~other.concerned) | (other.typed_logs & ~one.concerned)
    return np.asarray(known & lone)


def _turn_back(draft: Draft, arm: str, one: _LogArm, rows: list[int]) -> Iterator[Note]:
    column = f"{arm}_mean"
    for row in rows:
        centre = str(draft.text(f"{arm}_centre_kind")[row])
        words = (
            f"the {centre} {draft.number(column)[row]:.6g} and the SD {one.log_sd[row]:.6g} of "
            f"natural logarithms give the mean {one.mean[row]:.6g} and the SD {one.sd[row]:.6g}"
        )
        _rewrite(draft, arm, one, row, f"the values are log-normal: {words}")
        yield draft.note(
            levels.FIXED,
            "mean from logarithms",
            column,
            row,
            f"{words} of log-normal values",
            "nothing; for logarithms to base 10 choose 'mean of log10'; those of x + 1 cannot be "
            "turned back",
        )
        draft.number(column)[row] = one.mean[row]
        draft.mean_recovered[arm][row] = True


def _rewrite(draft: Draft, arm: str, one: _LogArm, row: int, assumed: str) -> None:
    """Put the SD of the values in place of that of logarithms, in the row and its derivation."""
    rule = draft.sd_rules[arm][row]
    rule = "from SD of logarithms" if rule == "as typed" else f"{rule}, then from logarithms"
    draft.sds[arm][row], draft.sd_rules[arm][row] = one.sd[row], rule
    before = _forget(draft, arm, row)
    if before is None:
        typed = f"{arm}_sd" if not np.isnan(draft.number(f"{arm}_sd")[row]) else f"{arm}_spread"
        derive(draft, arm, row, rule, [typed, f"{arm}_mean"], assumed)
        return
    mean = input_words(draft, f"{arm}_mean", row)
    before["inputs"] += "" if mean in before["inputs"] else f"; {mean}"
    before.update(sd=float(one.sd[row]), rule=rule)
    before["assumptions"] += f"; {assumed}"
    draft.derivations.append(before)


def _forget(draft: Draft, arm: str, row: int) -> dict | None:  # type: ignore[type-arg]
    """Take the derivation of an arm out of the table."""
    for place in range(len(draft.derivations) - 1, -1, -1):
        record = draft.derivations[place]
        if record["row"] == row and record["arm"] == arm:
            return draft.derivations.pop(place)
    return None


def _without_sd(draft: Draft, arm: str, one: _LogArm, rows: list[int]) -> Iterator[Note]:
    """Leave geometric means where an arm has no SD of logarithms; no SD is used then."""
    column = f"{arm}_mean"
    with np.errstate(over="ignore", under="ignore"):
        geometric = np.exp(one.log_mean)
    for row in rows:
        draft.sds[arm][row], draft.sd_rules[arm][row] = np.nan, None
        draft.pooled[row] = False
        _forget(draft, arm, row)
        if not one.typed_logs[row]:
            continue
        if not (np.isfinite(geometric[row]) and geometric[row] > 0):
            yield draft.note(
                levels.STOP,
                "mean of logs",
                column,
                row,
                "the antilogarithm of this mean is no number that can be computed with",
                "check the centre's kind and the number",
            )
            continue
        yield draft.note(
            levels.ASK,
            "centre is no mean",
            column,
            row,
            f"the mean of logarithms is used as the geometric mean {geometric[row]:.6g}, since an "
            "arm of the row has no SD of logarithms; both SDs count as missing until somebody "
            "decides",
            "type the SD (or SE, or CI) of the logarithms of both arms",
        )
        draft.number(column)[row] = geometric[row]


def _no_mean(draft: Draft, arm: str) -> Iterator[Note]:
    kinds, column = draft.text(f"{arm}_centre_kind"), f"{arm}_centre_kind"
    odd = (kinds == spreads.MEDIAN) | (kinds == spreads.GEOMETRIC_MEAN)
    yield from each_typed(
        draft,
        levels.ASK,
        "centre is no mean",
        column,
        where(odd & ~draft.mean_recovered[arm]),
        "the centre is no arithmetic mean; it is used as if it were one until somebody decides",
        "type the mean when the paper gives it, or quartiles beside a median, confidence limits "
        "beside a geometric mean; or leave the row out with exclude_reason",
    )
