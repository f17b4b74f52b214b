"""The SD of every arm: typed or converted, and what stands in the way."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.sheet.conversions import BY_KIND, ArmNumbers, Conversion
from drystone.sheet.draft import Draft, Mask, Texts, blank_numbers, blank_texts, where
from drystone.sheet.findings.agreement import disagreeing
from drystone.sheet.notes import Note
from drystone.sheet.raw import show
from drystone.words import arms, levels, spreads

AS_TYPED = "as typed"
CONVERSIONS = [(kind, way) for kind, ways in BY_KIND.items() for way in ways]
NO_SD = "the SD counts as missing until somebody decides"


def find_sds(draft: Draft) -> Iterator[Note]:
    """Set the SD to use for both arms, with derivations of converted ones."""
    yield from _confidence(draft)
    for arm in arms.ARMS:
        yield from _negative(draft, arm)
        yield from _single(draft, arm)
        yield from _find(draft, arm)
    for arm in arms.ARMS:
        yield from _zero(draft, arm)
    _forget_unused(draft)


def unused_spreads(draft: Draft) -> Iterator[Note]:
    """Spreads that are typed but not converted yet, where the arm has no SD."""
    without = {arm: np.isnan(draft.sds[arm]) for arm in arms.ARMS}
    for arm in arms.ARMS:
        yield from _lonely_limit(draft, arm, without[arm])
        kinds, spread = draft.text(f"{arm}_spread_kind"), ~np.isnan(draft.number(f"{arm}_spread"))
        other = np.array([kind not in BY_KIND and kind is not None for kind in kinds], dtype=bool)
        yield from draft.notes(
            levels.ASK,
            "spread not converted",
            f"{arm}_spread",
            where(without[arm] & spread & other),
            lambda row, kinds=kinds: f"a spread of kind {kinds[row]} is not converted yet; {NO_SD}",  # type: ignore[misc]
            "type an SD when the paper allows one",
        )
        for first, second in (("q1", "q3"), ("min", "max")):
            column = f"{arm}_{first}"
            both = ~np.isnan(draft.number(column) + draft.number(f"{arm}_{second}"))
            yield from draft.notes(
                levels.ASK,
                "spread not converted",
                column,
                where(without[arm] & ~spread & both),
                f"{first} and {second} are not converted yet; {NO_SD}",
                "type an SD when the paper allows one",
            )
    either = without[arms.CONTROL] | without[arms.TREATMENT]
    for column in ("pooled_spread", "test_value"):
        yield from draft.notes(
            levels.ASK,
            "spread not converted",
            column,
            where(either & ~np.isnan(draft.number(column))),
            f"{column} is not converted yet; {NO_SD}",
            "type the SD of each arm when the paper gives it",
        )


def _lonely_limit(draft: Draft, arm: str, without: Mask) -> Iterator[Note]:
    given = {end: ~np.isnan(draft.number(f"{arm}_{end}")) for end in ("lower", "upper")}
    for end, other in (("lower", "upper"), ("upper", "lower")):
        yield from draft.notes(
            levels.ASK,
            "one limit only",
            f"{arm}_{end}",
            where(without & given[end] & ~given[other]),
            f"the {other} limit is missing, so the interval's width is not known; {NO_SD}",
            "type both limits",
        )


def _confidence(draft: Draft) -> Iterator[Note]:
    percent = draft.number("confidence_percent")
    odd = ~np.isnan(percent) & ~((percent >= 50) & (percent < 100))
    yield from draft.notes(
        levels.ASK,
        "confidence level",
        "confidence_percent",
        where(odd),
        f"the level of an interval lies between 50 and 100; limits are not used, so {NO_SD}",
        "type 95 for a 95 % interval",
    )


def _negative(draft: Draft, arm: str) -> Iterator[Note]:
    for what in ("sd", "spread"):
        column = f"{arm}_{what}"
        yield from draft.notes(
            levels.STOP,
            "negative spread",
            column,
            where(draft.number(column) < 0),
            "a spread cannot be negative",
            "look for a typing error, or a value meant for another column",
        )


def _single(draft: Draft, arm: str) -> Iterator[Note]:
    n = draft.number(f"{arm}_n")
    single = (n >= 1) & (n < 2)
    for what in ("sd", "spread", "lower"):
        column = f"{arm}_{what}"
        yield from draft.notes(
            levels.WARN,
            "spread of one value",
            column,
            where(single & ~np.isnan(draft.number(column))),
            "n is 1, and one value has no spread; it counts as missing",
            "check n and what the spread belongs to",
        )


def _find(draft: Draft, arm: str) -> Iterator[Note]:
    """Typed SD first, then whatever can be converted."""
    numbers = _arm_numbers(draft, arm)
    typed = draft.number(f"{arm}_sd").copy()
    sds, rules = typed.copy(), blank_texts(draft.size)
    rules[~np.isnan(typed)] = AS_TYPED
    kinds = draft.text(f"{arm}_spread_kind")
    for kind, conversion in CONVERSIONS:
        rows = (kinds == kind) & conversion.given(numbers) & _plural(numbers)
        for wrong, mask in conversion.refused(numbers):
            yield from _refused(draft, arm, conversion, where(rows & mask & np.isnan(typed)), wrong)
            rows &= ~mask
        converted = np.where(rows, conversion.convert(numbers), np.nan)
        huge = where(np.isinf(converted))
        yield from _refused(draft, arm, conversion, huge, "its SD would be too large a number")
        rows &= np.isfinite(converted)
        both = rows & ~np.isnan(typed)
        yield from disagreeing(draft, arm, conversion, both, typed, converted)
        take = rows & np.isnan(typed)
        sds[take], rules[take] = converted[take], conversion.rule
        if kind != spreads.SD:
            yield from _derive(draft, arm, conversion, where(take & (converted > 0)), sds)
    bad = ~_plural(numbers) | (sds < 0)
    sds[bad], rules[bad] = np.nan, None
    draft.sds[arm], draft.sd_rules[arm] = sds, rules


def _plural(numbers: ArmNumbers) -> Mask:
    """Whether more than one replicate, or an unknown number, stands behind the arm."""
    return np.isnan(numbers.n) | (numbers.n >= 2)


def _arm_numbers(draft: Draft, arm: str) -> ArmNumbers:
    percent = draft.number("confidence_percent")
    return ArmNumbers(
        mean=draft.number(f"{arm}_mean"),
        n=draft.number(f"{arm}_n"),
        spread=draft.number(f"{arm}_spread"),
        lower=draft.number(f"{arm}_lower"),
        upper=draft.number(f"{arm}_upper"),
        confidence_percent=np.where(np.isnan(percent), 95.0, percent),
    )


def _refused(
    draft: Draft, arm: str, conversion: Conversion, rows: list[int], wrong: str
) -> Iterator[Note]:
    column = f"{arm}_{conversion.inputs[0]}"
    todo = "check what goes in; type the SD when it can be had"
    rule = f"{draft.text(f'{arm}_spread_kind')[rows[0]]} not used" if rows else ""
    yield from draft.notes(levels.ASK, rule, column, rows, f"{wrong}; {NO_SD}", todo)


def _derive(
    draft: Draft, arm: str, conversion: Conversion, rows: list[int], sds: np.ndarray
) -> Iterator[Note]:
    studies, names = draft.text("study"), draft.text("row_id")
    for row in rows:
        sd = float(sds[row])
        columns = [f"{arm}_{what}" if what != "confidence_percent" else what
                   for what in conversion.inputs]  # fmt: skip
        inputs = "; ".join(_input(draft, column, row) for column in columns)
        draft.derivations.append(
            {
                "row": row,
                "row_id": names[row],
                "study": studies[row],
                "arm": arm,
                "sd": sd,
                "rule": conversion.rule,
                "inputs": inputs,
                "assumptions": conversion.assumption + _borrowed(draft, arm, row),
            }
        )
        yield draft.note(
            levels.FIXED,
            f"SD {conversion.rule}",
            f"{arm}_{conversion.inputs[0]}",
            row,
            f"the SD {sd:.6g} was computed: {conversion.formula}",
            "nothing; the derivations table holds the inputs",
        )


def _input(draft: Draft, column: str, row: int) -> str:
    value = draft.number(column)[row]
    if column == "confidence_percent" and np.isnan(value):
        return "confidence_percent = 95 (blank)"
    cell = draft.cell(column, row)
    return f"{cell} {column} = {show(float(value))}".strip()


def _borrowed(draft: Draft, arm: str, row: int) -> str:
    if draft.cell(f"{arm}_n", row) and draft.typed(f"{arm}_n", row).strip():
        return ""
    return f"; n is not typed but borrowed ({draft.settings.missing_n})"


def _zero(draft: Draft, arm: str) -> Iterator[Note]:
    sds, rules = draft.sds[arm], draft.sd_rules[arm]
    other = draft.sds[arms.TREATMENT if arm == arms.CONTROL else arms.CONTROL]
    zero = sds == 0
    kept = zero & (other > 0) if draft.settings.zero_sd == "as typed" else np.zeros_like(zero)
    for mask, level, effect in (
        (zero & ~kept, levels.ASK, "it counts as missing until somebody decides"),
        (kept, levels.WARN, "it is kept, as 'zero_sd' in the config asks"),
    ):
        for row in where(mask):
            column = _origin(draft, arm, row, rules)
            wrong = f"the spread is zero, which is rounding or one repeated value; {effect}"
            todo = "check the paper; leave the cell blank when no spread is given"
            yield draft.note(level, "zero spread", column, row, wrong, todo)
    gone = zero & ~kept
    sds[gone], rules[gone] = np.nan, None


def _origin(draft: Draft, arm: str, row: int, rules: Texts) -> str:
    if not np.isnan(draft.number(f"{arm}_sd")[row]):
        return f"{arm}_sd"
    return f"{arm}_lower" if rules[row] == "from CI limits" else f"{arm}_spread"


def _forget_unused(draft: Draft) -> None:
    """Blank a level that no interval can have, so that the table holds allowed values only."""
    percent = draft.number("confidence_percent")
    percent[percent < 1] = blank_numbers(1)[0]
