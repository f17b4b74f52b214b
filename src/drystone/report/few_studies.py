"""When an interval rests on too few studies: the limit, and how the page says it.

Satterthwaite degrees of freedom below 4 are too few for the t reference of the CR2 standard error
(Tipton 2015, Psychol Methods 20:375-393); the page marks them under either kind of interval.
"""

from __future__ import annotations

from drystone.report import numbers

FEWEST_DF = 4.0
OPENING = "Too few studies"
NOTE = (
    f"Where the degrees of freedom (df) are below {FEWEST_DF:g}, too few studies speak about a "
    "coefficient: its interval and p value are rough."
)


def is_few(df: float) -> bool:
    """Whether an interval with ``df`` degrees of freedom is to be marked."""
    return df < FEWEST_DF


def marked(df: float) -> str:
    """Degrees of freedom for a table, marked when too few: '3.98 (below 4)'."""
    if not is_few(df):
        return numbers.number(df)
    return f"{numbers.below(df, FEWEST_DF)} (below {FEWEST_DF:g})"


def warning(df: float) -> str:
    """Sentence for the first screen; blank when there are enough studies."""
    if not is_few(df):
        return ""
    return (
        f"{OPENING}: the interval of the overall effect rests on "
        f"{numbers.below(df, FEWEST_DF)} degrees of freedom. Below {FEWEST_DF:g} its coverage "
        "cannot be trusted."
    )
