"""Control and treatment in each other's place."""

from __future__ import annotations

from collections import Counter, defaultdict
from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft, Floats
from drystone.sheet.findings.groups import log_ratios, open_rows, rows_by
from drystone.sheet.notes import Note
from drystone.words import arms, levels

FEWEST_OTHERS = 4
LEAST_EFFECT = 0.3  # below, the sign of an effect is chance
FAR = 5.0  # robust SDs
SURE = 3.0  # sampling SDs


def swapped_arms(draft: Draft) -> Iterator[Note]:
    """Warn of rows that name or number their arms the other way round than the others do."""
    told = set()
    for row in sorted(set(_by_names(draft))):
        told.add(row)
        yield _note(
            draft,
            row,
            "the treatment is what other rows of the study call the control",
        )
    for row in _by_sign(draft):
        if row not in told:
            yield _note(
                draft,
                row,
                "the effect has the other sign than every other row of the study, and as large",
            )


def _note(draft: Draft, row: int, wrong: str) -> Note:
    return draft.note(
        levels.WARN,
        "arms swapped",
        "treatment_mean",
        row,
        f"{wrong}; control and treatment may have changed places",
        "look the row up, and swap the cells of the two arms if so",
    )


def _by_names(draft: Draft) -> Iterator[int]:
    for what in ("id", "label"):
        used: dict[tuple[object, str], Counter[str]] = defaultdict(Counter)
        texts = {arm: draft.text(f"{arm}_{what}") for arm in arms.ARMS}
        studies = draft.text("study")
        rows = [
            row for row in open_rows(draft) if None not in {texts[arm][row] for arm in arms.ARMS}
        ]
        for row in rows:
            for arm in arms.ARMS:
                used[studies[row], arm][texts[arm][row]] += 1
        for row in rows:
            study = studies[row]
            controls, treatments = used[study, arms.CONTROL], used[study, arms.TREATMENT]
            control, treatment = texts[arms.CONTROL][row], texts[arms.TREATMENT][row]
            # control elsewhere at least twice, treatment only here; and what stands as control
            # here serves as control nowhere else
            if controls[treatment] >= 2 and treatments[treatment] == 1 == controls[control]:
                yield row


def _by_sign(draft: Draft) -> Iterator[int]:
    effects, errors = log_ratios(draft), _sampling_sd(draft)
    for rows in rows_by(draft, ["study", "outcome"]).values():
        known = [row for row in rows if not np.isnan(effects[row])]
        if len(known) > FEWEST_OTHERS:
            yield from (known[i] for i in _against(effects[known], errors[known]))


def _sampling_sd(draft: Draft) -> Floats:
    """SD of each log ratio by the delta method; zero where an SD is unknown."""
    variance = np.zeros(draft.size)
    for arm in arms.ARMS:
        mean, n = draft.number(f"{arm}_mean"), draft.number(f"{arm}_n")
        with np.errstate(all="ignore"):
            part = (draft.sds[arm] / mean) ** 2 / n
        variance += np.where(np.isfinite(part), part, 0.0)
    return np.sqrt(variance)


def _against(effects: Floats, error: Floats) -> list[int]:
    """Entries whose mirror image fits the others and which do not fit themselves."""
    signs = np.sign(effects)
    found = []
    for sign in (-1.0, 1.0):
        (odd,) = np.nonzero(signs == sign)
        if odd.size != 1 or not (np.delete(signs, odd) == -sign).all():
            continue
        others = np.delete(effects, odd)
        middle = float(np.median(others))
        scale = max(1.4826 * float(np.median(np.abs(others - middle))), 0.05)
        own = float(effects[odd[0]])
        fits = abs(-own - middle) < 2 * scale
        far = abs(own - middle) > max(FAR * scale, SURE * float(error[odd[0]]))
        if abs(middle) >= LEAST_EFFECT and fits and far:
            found.append(int(odd[0]))
    return found
