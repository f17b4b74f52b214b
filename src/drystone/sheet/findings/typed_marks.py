"""What a spreadsheet or a digitised figure leaves in cells: dates for names, needless digits."""

from __future__ import annotations

import datetime
import re
from collections.abc import Iterator

import numpy as np

from drystone.sheet.draft import Draft
from drystone.sheet.findings.groups import open_rows
from drystone.sheet.notes import Note
from drystone.sheet.rounding import significant_digits
from drystone.words import arms, levels

NAMES = (
    *("study", "site", "trial", "species", "outcome", "unit"),
    *("control_id", "treatment_id", "control_label", "treatment_label"),
)
FIGURE = re.compile(r"\bfig(?:ure|\.|s)?\b", re.IGNORECASE)
NEEDLESS = 5  # digits that nobody reads off a figure


def dates_for_names(draft: Draft) -> Iterator[Note]:
    """Warn of dates in columns that hold names, and of lone dates among a moderator's texts."""
    for name in [*NAMES, *draft.extras]:
        place = draft.place(name)
        if place is None or name not in draft.texts:
            continue
        cells = draft.table.columns[place]
        dates = [r for r, cell in enumerate(cells) if isinstance(cell, datetime.date)]
        if name in draft.extras and 2 * len(dates) > int(draft.has_text(name).sum()):
            continue  # a column of dates
        yield from draft.notes(
            levels.WARN,
            "date for a name",
            name,
            dates,
            "a date stands where a name is expected; the spreadsheet may have made it of a name "
            "such as 3-5 or MAR1",
            "type the name again in a cell formatted as text",
        )


def digitised_precision(draft: Draft) -> Iterator[Note]:
    """Warn of means read off a figure that are typed with five digits or more."""
    for arm in arms.ARMS:
        digitised, places = (draft.text(f"{arm}_{what}") for what in ("digitised", "source_place"))
        means = draft.number(f"{arm}_mean")
        rows = [
            row
            for row in open_rows(draft)
            if np.isfinite(means[row])
            and significant_digits(float(means[row])) >= NEEDLESS
            and (digitised[row] == "yes" or FIGURE.search(places[row] or ""))
        ]
        yield from draft.notes(
            levels.WARN,
            "digits of a figure",
            f"{arm}_mean",
            rows,
            "the mean was read off a figure but has more digits than a figure can show",
            "compare with numbers in the text; say 'yes' in the digitised column",
        )
