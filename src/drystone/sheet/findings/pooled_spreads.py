"""One SD for both arms, where an arm has none of its own.

An arm's own SD always wins. Both kinds in one row are never used without a finding, and a row with
a pooled SD is marked, since such SDs stay out of averages by arm.
"""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from drystone.maths.spread_recovery import pooled_sd
from drystone.sheet.conversion import Conversion, PairNumbers
from drystone.sheet.derive import derive
from drystone.sheet.draft import Draft, Floats, Mask, where
from drystone.sheet.findings.own_spreads import NO_SD
from drystone.sheet.notes import Note
from drystone.sheet.pooled_conversions import BY_POOLED_KIND, BY_TEST_KIND, FROM_DIFFERENCE
from drystone.words import arms, levels, spreads

SAME = 0.05  # relative difference that is not worth a question
BLOCKS_OUT = (
    "; blocks, pairs or plots are out of this SD, so that no correlation of the arms may be "
    "applied to it"
)
RESIDUAL_RULES = frozenset(
    way.rule
    for way in (*BY_POOLED_KIND.values(), *BY_TEST_KIND.values(), FROM_DIFFERENCE)
    if way.rule != spreads.POOLED_SD
)
"""Rules whose SD is a residual: within blocks it must not get an arm correlation again."""


def fill_pooled(draft: Draft) -> Iterator[Note]:
    """Give arms without an SD the one that both arms share; compare it with typed ones."""
    numbers = pair_numbers(draft)
    sources: list[tuple[Conversion[PairNumbers], Floats]] = []
    found = np.full(draft.size, np.nan)
    for conversion, rows in _ways(draft, numbers):
        if not rows.any():
            continue
        values = np.full(draft.size, np.nan)
        yield from _convert(draft, conversion, numbers, rows, values)
        yield from _unlike_sources(draft, conversion, found, values)
        sources.append((conversion, np.where(np.isnan(found), values, np.nan)))
        found = np.where(np.isnan(found), values, found)
    own = {arm: draft.sds[arm].copy() for arm in arms.ARMS}
    for conversion, values in sources:
        yield from _beside_own(draft, conversion, values, own)
        yield from _fill(draft, conversion, values, own)


def pair_numbers(draft: Draft) -> PairNumbers:
    """Numbers of each comparison as they stand now."""
    percent, df = draft.number("confidence_percent"), draft.number("error_df")
    plain = draft.number("control_n") + draft.number("treatment_n") - 2.0
    names = ("pooled_spread", "difference_lower", "difference_upper", "grand_mean",
             "number_of_means", "error_df", "test_value", "control_mean", "control_n",
             "treatment_mean", "treatment_n")  # fmt: skip
    designs = draft.text("design")
    independent = np.array([text in (None, "independent") for text in designs], dtype=bool)
    logs = [np.isin(draft.text(f"{arm}_centre_kind"), spreads.LOG_CENTRES) for arm in arms.ARMS]
    return PairNumbers(
        **{name: draft.number(name).copy() for name in names},
        confidence_percent=np.where(np.isnan(percent), 95.0, percent),
        test_df=np.where(~np.isnan(df) | ~independent, df, plain),
        on_logs=np.asarray(logs[0] & logs[1]),
    )


def _ways(draft: Draft, numbers: PairNumbers) -> Iterator[tuple[Conversion[PairNumbers], Mask]]:
    for column, ways in (("pooled_kind", BY_POOLED_KIND), ("test_kind", BY_TEST_KIND)):
        if column == "test_kind":
            yield FROM_DIFFERENCE, FROM_DIFFERENCE.given(numbers)
        for kind, conversion in ways.items():
            yield conversion, (draft.text(column) == kind) & conversion.given(numbers)


def _convert(
    draft: Draft,
    conversion: Conversion[PairNumbers],
    numbers: PairNumbers,
    rows: Mask,
    into: Floats,
) -> Iterator[Note]:
    """Write the SDs of ``rows`` into ``into``; ask where an arm needs one and cannot have it."""
    lacking = np.isnan(draft.sds[arms.CONTROL]) | np.isnan(draft.sds[arms.TREATMENT])
    rows = rows.copy()
    for wrong, mask in _reasons(draft, conversion, numbers):
        yield from _refused(draft, conversion, where(rows & mask & lacking), wrong)
        rows &= ~mask
    values = np.where(rows, conversion.convert(numbers), np.nan)
    odd = rows & ~np.isnan(numbers.control_n + numbers.treatment_n)
    odd &= ~(np.isfinite(values) & (values > 0))
    yield from _refused(draft, conversion, where(odd & lacking), "no SD above zero comes out of it")
    good = rows & np.isfinite(values) & (values > 0)
    into[good] = values[good]


def _reasons(
    draft: Draft, conversion: Conversion[PairNumbers], numbers: PairNumbers
) -> Iterator[tuple[str, Mask]]:
    centres = [draft.text(f"{arm}_centre_kind") for arm in arms.ARMS]
    geometric = np.asarray(
        (centres[0] == spreads.GEOMETRIC_MEAN) | (centres[1] == spreads.GEOMETRIC_MEAN)
    )
    yield "a spread beside geometric means may be one of logarithms or of values", geometric
    for column in conversion.needs:
        missing = np.isnan(getattr(numbers, column)) & ~draft.was_unreadable(column)
        yield f"it cannot be converted without {column}", missing
        yield f"{column} cannot be read", draft.was_unreadable(column)
    yield from conversion.refused(numbers)


def _refused(
    draft: Draft, conversion: Conversion[PairNumbers], rows: list[int], wrong: str
) -> Iterator[Note]:
    column = conversion.inputs[0]
    needed = [name for name in (*conversion.needs, "error_df") if name in wrong]
    for row in rows:
        kind = _kind(draft, conversion, row)
        todo = "check what goes in; type the SD of each arm when it can be had"
        if needed:
            cell = draft.cell(needed[0], row)
            place = f"cell {cell}" if cell else "a column to be added"
            todo = f"fill in {needed[0]}, {place} ({_MEANINGS[needed[0]]})"
        yield draft.note(
            levels.ASK, "spread not converted", column, row, f"{kind}: {wrong}; {NO_SD}", todo
        )


_MEANINGS = {
    "error_df": "degrees of freedom of the error, or of the test: with T treatments "
    "(T - 1)(B - 1) in B blocks, T (n - 1) without blocks, one below the number of pairs",
    "number_of_means": "2 when F compares these two arms alone; for an HSD, how many means it "
    "compares",
    "grand_mean": "the mean of the whole table that the CV% belongs to",
}


def _kind(draft: Draft, conversion: Conversion[PairNumbers], row: int) -> str:
    if conversion is FROM_DIFFERENCE:
        return "CI of the difference"
    column = "pooled_kind" if conversion.inputs[0] == "pooled_spread" else "test_kind"
    return str(draft.text(column)[row])


def _unlike_sources(
    draft: Draft, conversion: Conversion[PairNumbers], first: Floats, second: Floats
) -> Iterator[Note]:
    for row in where(_unlike(first, second)):
        yield draft.note(
            levels.ASK,
            "pooled spreads disagree",
            conversion.inputs[0],
            row,
            f"this spread gives the SD {second[row]:.6g} ({conversion.rule}), another one of the "
            f"row {first[row]:.6g}; the other one is used until somebody decides",
            "look both up; blank the wrong one",
        )


def _beside_own(
    draft: Draft, conversion: Conversion[PairNumbers], values: Floats, own: dict[str, Floats]
) -> Iterator[Note]:
    """Ask where typed SDs and the pooled spread of a row say different things; name mixed rows."""
    column = conversion.inputs[0]
    counts = [draft.number(f"{arm}_n") for arm in arms.ARMS]
    both = pooled_sd(own["control"], counts[0], own["treatment"], counts[1])
    one = np.where(np.isnan(own["control"]), own["treatment"], own["control"])
    mixed = np.isnan(own["control"]) != np.isnan(own["treatment"])
    mine = np.where(mixed, one, both)
    unlike = _unlike(mine, values)
    for row in where(unlike | (mixed & ~np.isnan(values))):
        if mixed[row]:
            which = f"an own SD of one arm ({mine[row]:.6g})"
            use = "it is used, and the common one for the other arm,"
        else:
            which = f"own SDs of the arms ({mine[row]:.6g} when pooled)"
            use = "the own ones are used"
        yield draft.note(
            levels.ASK if unlike[row] else levels.WARN,
            "own and pooled SDs disagree" if unlike[row] else "own and pooled SD in one row",
            column,
            row,
            f"{which} and {values[row]:.6g} for both ({conversion.rule}) stand in one row; "
            f"{use} until somebody decides",
            "look both up; blank the one that should not be used",
        )


def _unlike(first: Floats, second: Floats) -> Mask:
    return np.asarray(np.abs(first - second) > SAME * np.fmax(np.abs(first), np.abs(second)))


def _fill(
    draft: Draft, conversion: Conversion[PairNumbers], values: Floats, own: dict[str, Floats]
) -> Iterator[Note]:
    lacking = {arm: np.isnan(own[arm]) & ~np.isnan(values) for arm in arms.ARMS}
    blocks = _within_blocks(draft) & (conversion.rule in RESIDUAL_RULES)
    for row in where(lacking[arms.CONTROL] | lacking[arms.TREATMENT]):
        draft.pooled[row] = True
        for arm in arms.ARMS:
            if lacking[arm][row]:
                draft.sds[arm][row], draft.sd_rules[arm][row] = values[row], conversion.rule
                assumed = conversion.assumption + (BLOCKS_OUT if blocks[row] else "")
                derive(draft, arm, row, conversion.rule, conversion.inputs, assumed)
        yield draft.note(
            levels.FIXED,
            f"SD {conversion.rule}",
            conversion.inputs[0],
            row,
            f"the SD {values[row]:.6g}, one for both arms, was computed: {conversion.formula}",
            "nothing; the derivations table holds the inputs",
        )
        if blocks[row]:
            yield from _correlation_inside(draft, row)


def _within_blocks(draft: Draft) -> Mask:
    words = [set((text or "").split(", ")) for text in draft.text("design")]
    return np.array([bool(spreads.WITHIN_BLOCKS & found) for found in words], dtype=bool)


def _correlation_inside(draft: Draft, row: int) -> Iterator[Note]:
    """Take a typed correlation away from a residual SD: it would count twice."""
    if np.isnan(draft.number("arm_correlation")[row]):
        return
    draft.number("arm_correlation")[row] = np.nan
    yield draft.note(
        levels.WARN,
        "correlation already inside",
        "arm_correlation",
        row,
        "the SD is that of the residual, so what the arms share by block or pair is out of it "
        "already; the correlation is not applied again",
        "nothing; or type the SDs of the arms across blocks, and the correlation goes with them",
    )
