"""Whether one physical arm has the same numbers in every row."""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft
from drystone.sheet.notes import Note
from drystone.words import arms, levels

Place = tuple[str, int]  # arm, row
Key = tuple[str, str | None, str | None, str]


def unlike_arms(draft: Draft) -> Iterator[Note]:
    """Ask about arms that share study, outcome, date and name but not mean, SD or n."""
    for (study, _, _, name), places in _places(draft).items():
        for what in ("mean", "sd", "n"):
            known = [place for place in places if not np.isnan(_value(draft, what, place))]
            odd = [p for p in known if _value(draft, what, p) != _value(draft, what, known[0])]
            if odd:
                yield _unlike(draft, study, name, what, known[0], odd[0])


def _unlike(draft: Draft, study: str, name: str, what: str, first: Place, other: Place) -> Note:
    values = [f"{_value(draft, what, place):.6g}" for place in (first, other)]
    cells = [draft.cell(f"{arm}_{what}", row) for arm, row in (first, other)]
    words = [
        f"{value} in {cell}" if cell else value for value, cell in zip(values, cells, strict=True)
    ]
    return draft.note(
        levels.ASK,
        "arm with two faces",
        f"{other[0]}_{what}",
        other[1],
        f"arm '{name}' of '{study}' has {what} {words[0]} but {words[1]}; the rows count as "
        "different arms until somebody decides",
        "mend the number, or give the arms different names (or dates)",
    )


def _places(draft: Draft) -> dict[Key, list[Place]]:
    places: dict[Key, list[Place]] = defaultdict(list)
    studies, outcomes, dates = (draft.text(name) for name in ("study", "outcome", "date"))
    names = {arm: draft.text(f"{arm}_id") for arm in arms.ARMS}
    for row in range(draft.size):
        if row in draft.left_out or studies[row] is None:
            continue
        for arm in arms.ARMS:
            if names[arm][row] is not None:
                key = (studies[row], outcomes[row], dates[row], names[arm][row])
                places[key].append((arm, row))
    return places


def _value(draft: Draft, what: str, place: Place) -> float:
    arm, row = place
    values = draft.sds[arm] if what == "sd" else draft.number(f"{arm}_{what}")
    return float(values[row])
