"""Rows that the team itself leaves out, and studies without an entry in the studies table."""

from __future__ import annotations

from collections.abc import Iterator

from drystone.settings.problems import nearest
from drystone.sheet.draft import Draft, where
from drystone.sheet.notes import Note
from drystone.tables.studies import STATUSES_LEFT_OUT
from drystone.words import levels

EXCLUDED = "excluded by the team"


def left_out_by_team(draft: Draft) -> Iterator[Note]:
    """Book rows with an exclude_reason, and rows of pending or retracted studies."""
    for row in where(draft.has_text("exclude_reason")):
        draft.left_out[row] = (EXCLUDED, draft.text("exclude_reason")[row])
    statuses = dict(zip(draft.studies["study"], draft.studies["status"], strict=True))
    for row, study in enumerate(draft.text("study")):
        status = statuses.get(study)
        if status in STATUSES_LEFT_OUT:
            reason = f"the studies table says that '{study}' is {status}"
            draft.left_out.setdefault(row, (f"study {status}", reason))
    yield from ()


def unknown_studies(draft: Draft) -> Iterator[Note]:
    """Say which studies the studies table lacks, once for each study."""
    known = set(draft.studies["study"])
    if not known:
        return
    told: set[str] = set()
    hinted = 20  # the search for the nearest name is slow
    for row, study in enumerate(draft.text("study")):
        if study is None or study in known or study in told:
            continue
        told.add(study)
        hint = nearest(study, known) if len(told) <= hinted else "look for a typing error"
        yield draft.note(
            levels.WARN,
            "study not in the studies table",
            "study",
            row,
            f"'{study}' has no row in the studies table: {hint[:200]}",
            "add the study there, or mend the name",
        )
