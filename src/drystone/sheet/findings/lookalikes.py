"""Arms that several rows seem to share, judged by their numbers where names are absent."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator

from drystone.sheet.draft import Draft
from drystone.sheet.findings.groups import (
    LESS_DISTINCT,
    MORE_DISTINCT,
    Numbers,
    arm_numbers,
    names_of,
    open_rows,
)
from drystone.sheet.notes import Note
from drystone.words import arms, levels

Key = tuple[object, object, object, Numbers]  # study, outcome, date, numbers
APART = "they count as separate arms until somebody decides"


def shared_arms(draft: Draft) -> Iterator[Note]:
    """Ask about equal numbers in several rows whose arms do not carry one name."""
    for arm in arms.ARMS:
        other = arms.TREATMENT if arm == arms.CONTROL else arms.CONTROL
        names = draft.text(f"{arm}_id")
        digits = LESS_DISTINCT if arm == arms.CONTROL else MORE_DISTINCT
        for key, rows in _by_numbers(draft, arm, digits).items():
            if len(rows) < 2 or _one_name([names[row] for row in rows]):
                continue
            if len({arm_numbers(draft, other, row, 0) for row in rows}) < 2:
                continue  # the whole row stands twice, which is another finding
            mean = key[3][0]
            yield draft.note(
                levels.ASK,
                f"shared {arm}",
                f"{arm}_mean",
                rows[1],
                f"rows {names_of(draft, rows)} have the same {arm} numbers (mean {mean:g}) without "
                f"one {arm}_id for them; {APART}",
                f"type one {arm}_id in all of them when it is one arm, different ones when not",
            )


def chained_arms(draft: Draft) -> Iterator[Note]:
    """Arms that are treatment in one row and control in another."""
    yield from _named_chains(draft)
    control, treatment = (_by_numbers(draft, arm, MORE_DISTINCT) for arm in arms.ARMS)
    for key in control.keys() & treatment.keys():
        first, second = treatment[key][0], control[key][0]
        ids = draft.text("treatment_id")[first], draft.text("control_id")[second]
        if first == second or (ids[0] is not None and ids[0] == ids[1]):
            continue
        yield draft.note(
            levels.ASK,
            "chained arms",
            "control_mean",
            second,
            f"the control has the numbers of the treatment of {names_of(draft, [first])}, so the "
            f"two rows seem to share this arm; {APART}",
            "type the same name as control_id here and treatment_id there when it is one arm",
        )


def _named_chains(draft: Draft) -> Iterator[Note]:
    places: dict[tuple[object, ...], dict[str, int]] = defaultdict(dict)
    for row in open_rows(draft):
        for arm in arms.ARMS:
            name = draft.text(f"{arm}_id")[row]
            if name is not None:
                places[(*_key(draft, row), name)].setdefault(arm, row)
    for key, rows in places.items():
        if len(rows) == 2 and rows[arms.CONTROL] != rows[arms.TREATMENT]:
            yield draft.note(
                levels.FIXED,
                "chained contrasts",
                "control_id",
                rows[arms.CONTROL],
                f"arm '{key[-1]}' is the control here and the treatment of "
                f"{names_of(draft, [rows[arms.TREATMENT]])}; the two effects get a negative "
                "sampling covariance",
                "nothing, unless control and treatment were swapped in one of the rows",
            )


def _by_numbers(draft: Draft, arm: str, digits: int) -> dict[Key, list[int]]:
    found: dict[Key, list[int]] = defaultdict(list)
    for row in open_rows(draft):
        numbers = arm_numbers(draft, arm, row, digits)
        if numbers is not None:
            found[(*_key(draft, row), numbers)].append(row)
    return found


def _key(draft: Draft, row: int) -> tuple[object, object, object]:
    return tuple(draft.text(name)[row] for name in ("study", "outcome", "date"))  # type: ignore[return-value]


def _one_name(names: list[object]) -> bool:
    return names[0] is not None and len(set(names)) == 1
