"""A proposal as the text of a config: every guess a line of its own, its reason as a comment."""

from __future__ import annotations

from collections.abc import Iterator

from drystone.sheet.guess.arm_columns import Guess
from drystone.sheet.guess.proposal import Proposal

_COMMENT = 150  # characters; longer reasons are cut


def config_text(proposal: Proposal, sheet: str, name: str) -> str:
    """Text of config.yaml; ``sheet`` is the path in the review folder, ``name`` the team's file."""
    return "\n".join(_lines(proposal, sheet, name)) + "\n"


def _lines(proposal: Proposal, sheet: str, name: str) -> Iterator[str]:
    yield f"# Config of this review, proposed from {_comment(name)}. Every line below is a guess"
    yield "# with its reason behind it: read them, correct what is wrong, then `drystone check`."
    yield "# All options with their defaults: config/README.md of drystone."
    yield ""
    yield "# The team's own file; it is read and never written."
    yield f"sheet: {quoted(sheet)}"
    yield ""
    yield from _layout(proposal)
    for ask in proposal.asks:
        yield f"# DECIDE: {_comment(ask, 400)}"
    yield "# drystone's names: the team's headers."
    yield "columns:"
    for guess in proposal.columns:
        yield _column(guess)
    for guess in proposal.spare:
        yield f"  # {_column(guess).strip()}"
    for header in proposal.moderators:
        yield f"  # as it is, usable in models and filters: {_comment(quoted(header))}"
    if proposal.spread_kind:
        yield ""
        yield "defaults:"
        yield f"  spread_kind: {quoted(proposal.spread_kind)}  # what the spread columns hold"
    yield ""
    yield from _outcomes(proposal)


def _layout(proposal: Proposal) -> Iterator[str]:
    layout = proposal.layout
    yield "# Where the comparisons stand: sheet, first header line, number of header lines."
    yield "layout:"
    if layout.sheet is not None:
        yield f"  sheet: {quoted(layout.sheet)}  # {proposal.rows} rows, and columns of both arms"
    yield f"  header_row: {layout.header_row or 1}"
    yield f"  header_rows: {layout.header_rows}"
    yield ""


def _column(guess: Guess) -> str:
    return f"  {guess.ours}: {quoted(guess.theirs)}  # {_comment(guess.reason)}"


def _outcomes(proposal: Proposal) -> Iterator[str]:
    yield "# What was measured. scale: ratio needs a true zero and no upper bound."
    yield "outcomes:"
    for item in proposal.outcomes:
        unit = f"unit: {quoted(item.unit)}, " if item.unit else ""
        reason = _comment(f"{item.rows} rows; {item.reason}")
        yield f"  {quoted(item.name)}: {{{unit}scale: {item.scale}}}  # {reason}"
    analyses = proposal.settings(sheet="").get("analyses")
    if analyses:
        yield ""
        yield "# Written out, since the names of some outcomes would share a folder."
        yield "analyses:"
        for key, content in analyses.items():
            yield f"  {quoted(key)}: {{outcome: {quoted(content['outcome'])}}}"


def quoted(text: str) -> str:
    r"""Text as YAML reads it back, whatever it holds.

    Examples
    --------
    >>> quoted('5" pots: yes')
    '"5\\" pots: yes"'
    """
    return '"' + "".join(map(_escaped, text)) + '"'


def _escaped(sign: str) -> str:
    if sign in '"\\':
        return f"\\{sign}"
    if sign.isprintable():
        return sign
    return f"\\u{ord(sign):04x}" if ord(sign) < 0x10000 else f"\\U{ord(sign):08x}"


def _comment(text: str, most: int = _COMMENT) -> str:
    clean = " ".join("".join(c if c.isprintable() else " " for c in text).split())
    return clean if len(clean) <= most else f"{clean[: most - 3]}..."
