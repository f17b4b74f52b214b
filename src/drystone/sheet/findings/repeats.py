"""Numbers that stand twice: in both arms of a row, in two rows, in two papers."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator
from itertools import combinations

from drystone.sheet.draft import Draft
from drystone.sheet.findings.groups import (
    MORE_DISTINCT,
    Numbers,
    arm_numbers,
    names_of,
    open_rows,
)
from drystone.sheet.notes import Note
from drystone.words import arms, levels

ENOUGH_ARMS = 3
MOST_STUDIES = 8  # an arm found in more studies is no fingerprint


def equal_arms(draft: Draft) -> Iterator[Note]:
    """Ask about rows whose treatment is their control, by name or by numbers."""
    for row in open_rows(draft):
        names = {draft.text(f"{arm}_id")[row] for arm in arms.ARMS}
        if len(names) == 1 and None not in names:
            wrong = "control and treatment carry the same name"
            column = "treatment_id"
        else:
            control, treatment = (arm_numbers(draft, arm, row, MORE_DISTINCT) for arm in arms.ARMS)
            if control is None or control != treatment or None in control:
                continue
            wrong = "control and treatment have the same mean, SD and n"
            column = "treatment_mean"
        yield draft.note(
            levels.ASK,
            "control is the treatment",
            column,
            row,
            f"{wrong}, as after copying a cell too far; the row is used as typed until somebody "
            "decides",
            "look both arms up in the paper",
        )


def repeated_rows(draft: Draft) -> Iterator[Note]:
    """Ask about rows of one study with the same numbers in both arms."""
    seen: dict[tuple[object, ...], int] = {}
    for row in open_rows(draft):
        numbers = tuple(arm_numbers(draft, arm, row, MORE_DISTINCT) for arm in arms.ARMS)
        if None in numbers or numbers[0] == numbers[1]:
            continue
        key = (draft.text("study")[row], *numbers)
        first = seen.setdefault(key, row)
        if first == row:
            continue
        differ = _differing(draft, first, row)
        what = "in every column" if not differ else f"but for {', '.join(differ[:5])}"
        yield draft.note(
            levels.ASK,
            "repeated row",
            "treatment_mean",
            row,
            f"the row has the means, SDs and n of row {names_of(draft, [first])}, and is the same "
            f"{what}; both are used until somebody decides",
            "say in exclude_reason that it is a copy, or mend what should differ",
        )


def same_trial(draft: Draft) -> Iterator[Note]:
    """Ask about two studies that share the numbers of three arms or more."""
    places: dict[tuple[object, Numbers], dict[str, int]] = defaultdict(dict)
    for row in open_rows(draft):
        for arm in arms.ARMS:
            numbers = arm_numbers(draft, arm, row, MORE_DISTINCT)
            if numbers is not None:
                key = draft.text("outcome")[row], numbers
                places[key].setdefault(draft.text("study")[row], row)
    shared: dict[tuple[str, str], list[tuple[int, int]]] = defaultdict(list)
    for rows in places.values():
        if 2 <= len(rows) <= MOST_STUDIES:
            for one, two in combinations(sorted(rows, key=rows.__getitem__), 2):
                shared[one, two].append((rows[one], rows[two]))
    for (one, two), pairs in shared.items():
        if len(pairs) >= ENOUGH_ARMS:
            yield draft.note(
                levels.ASK,
                "same trial in two studies",
                "study",
                pairs[0][1],
                f"'{one}' and '{two}' share the numbers of {len(pairs)} arms (such as "
                f"{names_of(draft, pairs[0])}); both are used until somebody decides",
                "if it is one trial, keep one of them and say why in exclude_reason",
            )


IGNORED = frozenset({"row_id", "note", "extractor", "checker", "exclude_reason"})


def _differing(draft: Draft, one: int, two: int) -> list[str]:
    """Names of columns in which two rows differ as typed."""
    names = [*draft.found, *draft.extras]
    return [
        name
        for name in names
        if name not in IGNORED and draft.typed(name, one) != draft.typed(name, two)
    ]
