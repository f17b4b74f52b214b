"""The SD of one arm from its own cells: typed, or converted from what is typed in its place."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.conversion import ArmNumbers, Conversion
from drystone.sheet.conversions import BY_KIND
from drystone.sheet.derive import derive, of_arm
from drystone.sheet.draft import Draft, Floats, Mask, blank_texts, where
from drystone.sheet.findings.agreement import disagreeing
from drystone.sheet.notes import Note
from drystone.words import levels, spreads

AS_TYPED = "as typed"
CONVERSIONS = [(kind, way) for kind, ways in BY_KIND.items() for way in ways]
NO_SD = "the SD counts as missing until somebody decides"


def find_own(draft: Draft, arm: str) -> Iterator[Note]:
    """Typed SD first, then whatever can be converted."""
    numbers = arm_numbers(draft, arm)
    geometric = np.asarray(draft.text(f"{arm}_centre_kind") == spreads.GEOMETRIC_MEAN)
    yield from _beside_geometric_mean(draft, arm, geometric)
    typed = np.where(geometric, np.nan, draft.number(f"{arm}_sd"))
    sds, rules = typed.copy(), blank_texts(draft.size)
    rules[~np.isnan(typed)] = AS_TYPED
    draft.sds[arm], draft.sd_rules[arm] = sds, rules
    kinds = draft.text(f"{arm}_spread_kind")
    for kind, conversion in CONVERSIONS:
        rows = (kinds == kind) & conversion.given(numbers) & _plural(numbers)
        rows &= geometric if conversion.of_geometric_mean else ~geometric
        if not rows.any():
            continue
        for wrong, mask in conversion.refused(numbers):
            yield from _refused(draft, arm, conversion, where(rows & mask & np.isnan(typed)), wrong)
            rows &= ~mask
        converted = np.where(rows, conversion.convert(numbers), np.nan)
        huge = where(np.isinf(converted))
        yield from _refused(draft, arm, conversion, huge, "its SD would be too large a number")
        rows &= np.isfinite(converted)
        both = rows & ~np.isnan(typed)
        yield from disagreeing(draft, arm, conversion, both, typed, converted)
        take = rows & np.isnan(sds)
        sds[take], rules[take] = converted[take], conversion.rule
        if kind != spreads.SD:
            yield from _converted(draft, arm, conversion, numbers, where(take & (converted > 0)))
    bad = ~_plural(numbers) | (sds < 0)
    sds[bad], rules[bad] = np.nan, None


def arm_numbers(draft: Draft, arm: str) -> ArmNumbers:
    """Numbers of one arm as they stand now."""
    percent = draft.number("confidence_percent")
    names = ("mean", "n", "spread", "lower", "upper", "q1", "q3", "min", "max")
    return ArmNumbers(
        **{name: draft.number(f"{arm}_{name}").copy() for name in names},
        confidence_percent=np.where(np.isnan(percent), 95.0, percent),
        is_median=np.asarray(draft.text(f"{arm}_centre_kind") == spreads.MEDIAN),
    )


def _plural(numbers: ArmNumbers) -> Mask:
    """Whether more than one replicate, or an unknown number, stands behind the arm."""
    return np.isnan(numbers.n) | (numbers.n >= 2)


def _beside_geometric_mean(draft: Draft, arm: str, geometric: Mask) -> Iterator[Note]:
    """Ask about spreads whose scale is unknown; only limits say that they are multiplicative."""
    limits = np.asarray(draft.text(f"{arm}_spread_kind") == spreads.CI)
    limits &= ~np.isnan(draft.number(f"{arm}_lower") + draft.number(f"{arm}_upper"))
    for what in ("sd", "spread", "q1", "min"):
        typed = geometric & ~limits & ~np.isnan(draft.number(f"{arm}_{what}"))
        yield from draft.notes(
            levels.ASK,
            "spread of a geometric mean",
            f"{arm}_{what}",
            where(typed),
            "a spread beside a geometric mean may be an SD of the values, of their logarithms, or "
            f"a factor; {NO_SD}",
            "type its confidence limits with the kind CI; or type mean and SD of the logarithms, "
            "with 'mean of logs' as the centre's kind",
        )


def _refused(
    draft: Draft, arm: str, conversion: Conversion[ArmNumbers], rows: list[int], wrong: str
) -> Iterator[Note]:
    column = f"{arm}_{conversion.inputs[0]}"
    todo = "check what goes in; type the SD when it can be had"
    rule = f"{draft.text(f'{arm}_spread_kind')[rows[0]]} not used" if rows else ""
    yield from draft.notes(levels.ASK, rule, column, rows, f"{wrong}; {NO_SD}", todo)


def _converted(
    draft: Draft,
    arm: str,
    conversion: Conversion[ArmNumbers],
    numbers: ArmNumbers,
    rows: list[int],
) -> Iterator[Note]:
    columns = of_arm(arm, conversion.inputs)
    means = conversion.centre(numbers) if conversion.centre else np.full(draft.size, np.nan)
    for row in rows:
        more = _with_mean(draft, arm, row, means)
        derive(draft, arm, row, conversion.rule, columns, conversion.assumption + more)
        yield draft.note(
            levels.FIXED,
            f"SD {conversion.rule}",
            columns[0],
            row,
            f"the SD {draft.sds[arm][row]:.6g} was computed: {conversion.formula}{more}",
            "nothing; the derivations table holds the inputs",
        )
    changed = [row for row in rows if not np.isnan(means[row])]
    draft.number(f"{arm}_mean")[changed] = means[changed]
    draft.mean_recovered[arm][changed] = True


def _with_mean(draft: Draft, arm: str, row: int, means: Floats) -> str:
    if np.isnan(means[row]):
        return ""
    median = draft.number(f"{arm}_mean")[row]
    return f"; in place of the median {median:.6g} stands the mean {means[row]:.6g} (Luo 2018)"
