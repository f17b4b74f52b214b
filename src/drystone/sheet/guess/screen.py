"""A proposal and its findings on one screen: what was guessed, what to decide, what is wrong."""

from __future__ import annotations

import textwrap
from collections import Counter
from collections.abc import Iterator, Sequence

from drystone.sheet.guess.arm_columns import Guess
from drystone.sheet.guess.outcomes import OutcomeGuess
from drystone.sheet.guess.proposal import Proposal
from drystone.sheet.present import Line
from drystone.words import arms

WIDTH = 100
ROWS = 39  # a newcomer's first screen stays under forty lines
MOST_NAMES = 6
_LEFT = 12


def guess_lines(proposal: Proposal, name: str) -> list[str]:
    """What was guessed, at most some twenty lines of `WIDTH` characters."""
    return [
        line
        for head, text in _entries(proposal, name)
        for line in _wrapped(head, text, most=2 if head else 3)
    ]


def finding_lines(lines: Sequence[Line], room: int) -> list[str]:
    """Findings of one kind in one entry; those that do not fit in ``room`` lines are counted."""
    shown: list[str] = []
    for place, line in enumerate(lines):
        entry = _wrapped("", _brief(line), most=2)
        last = place == len(lines) - 1
        if len(shown) + len(entry) > room - (0 if last else 1):
            rest = Counter(other.level for other in lines[place:])
            counts = ", ".join(f"{count} {level}" for level, count in rest.items())
            return [*shown, f"and {len(lines) - place} more kinds of findings ({counts})"]
        shown += entry
    return shown


def _entries(proposal: Proposal, name: str) -> Iterator[tuple[str, str]]:
    yield "", f"{name}: {proposal.rows} rows, {_place(proposal)}. Guessed columns:"
    by_ours = {guess.ours: guess for guess in proposal.columns}
    for ours, guess in by_ours.items():
        if _arm(ours) is None:
            yield ours, f"{guess.theirs} ({guess.reason})"
    for arm in arms.ARMS:
        mine = [guess for guess in proposal.columns if _arm(guess.ours) == arm]
        yield arm, _arm_text(mine, arm, proposal.spread_kind)
    yield "outcomes", _listed([_outcome(item) for item in proposal.outcomes], 4)
    if proposal.spare:
        named = ", ".join(guess.theirs for guess in proposal.spare)
        yield "not used", f"{named} ({proposal.spare[0].reason})"
    if proposal.moderators:
        yield "moderators", _listed(list(proposal.moderators), MOST_NAMES)
    for ask in proposal.asks:
        yield "", f"ask: {ask}."


def _place(proposal: Proposal) -> str:
    layout = proposal.layout
    first, last = layout.header_row or 1, (layout.header_row or 1) + layout.header_rows - 1
    rows = f"row {first}" if first == last else f"rows {first} to {last}"
    sheet = f"sheet '{layout.sheet}', " if layout.sheet else ""
    codebook = " (explained by a codebook sheet)" if proposal.codebook else ""
    return f"{sheet}headers in {rows}{codebook}"


def _arm(ours: str) -> str | None:
    return next((arm for arm in arms.ARMS if ours.startswith(f"{arm}_")), None)


def _arm_text(guesses: Sequence[Guess], arm: str, kind: str) -> str:
    parts = []
    for guess in guesses:
        what = guess.ours.removeprefix(f"{arm}_")
        parts.append(f"{kind if what == 'spread' and kind else what} {guess.theirs}")
    mean = next(guess for guess in guesses if guess.ours == f"{arm}_mean")
    return f"{', '.join(parts)} ({mean.reason})"


def _outcome(item: OutcomeGuess) -> str:
    unit = f" in {item.unit}" if item.unit else ""
    return f"{item.name}{unit} ({item.rows} rows, {item.scale})"


def _listed(names: Sequence[str], most: int) -> str:
    more = f", and {len(names) - most} more" if len(names) > most else ""
    return ", ".join(names[:most]) + more


def _brief(line: Line) -> str:
    times = f", {line.count} times" if line.count > 1 else ""
    more = ", ..." if line.count > len(line.cells) > 0 else ""
    where = f", {', '.join(line.cells)}{more}" if line.cells else ""
    topic = f"{line.rule} ({line.column})" if line.column else line.rule
    return f"{line.level}: {topic}{times}{where}: {line.wrong}"


def _wrapped(head: str, text: str, most: int) -> list[str]:
    """Lines of ``text``, the first with ``head`` before it; what is too long ends in dots."""
    indent = " " * (_LEFT + 2) if head else "    "
    first = f"  {head:<{_LEFT}}" if head else ""
    return textwrap.wrap(
        text,
        WIDTH,
        initial_indent=first,
        subsequent_indent=indent,
        max_lines=most,
        placeholder=" ...",
        break_on_hyphens=False,
    )
