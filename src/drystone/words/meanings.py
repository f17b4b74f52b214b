"""Words in outcome names and units that say what a number can mean.

Word lists: common practice, no source.
"""

from __future__ import annotations

import re

_OPEN, _CLOSE = r"(?<![a-z0-9])(?:", r")(?![a-z0-9])"


def _words(*patterns: str) -> re.Pattern[str]:
    return re.compile(_OPEN + "|".join(patterns) + _CLOSE, re.IGNORECASE)


NO_TRUE_ZERO = _words(
    r"(?:°|deg(?:rees?)?\.?) ?[cf]",
    r"celsius|fahrenheit|temperature",
    r"ph",
    r"(?:laying|flowering|heading|sowing|hatching|arrival|emergence|julian|start|end) dates?",
    r"dates?(?: of [a-z ]+)?",
    r"day of (?:the )?year|julian days?|doy|days? after 1? ?jan(?:uary)? ?1?",
    r"ndvi|evi|savi|ndwi",
    r"anomal(?:y|ies)|z[- ]?scores?|standardi[sz]ed",
    r"(?:delta|δ|d) ?(?:13 ?c|15 ?n|18 ?o)",
    r"redox(?: potential)?|water potential|spei|spi",
)
"""Zero is a convention, so a ratio changes with the unit."""

LOGARITHM = _words(r"log(?:10|2|e)?(?: ?\(.*\))?", r"ln", r"log[- ]?transformed", r"db|decibels?")
"""The numbers are logarithms."""

CHANGE = _words(
    r"(?:percent(?:age)? |relative |net )?changes?",
    r"reductions?|differences?|declines?",
    r"(?:%|per ?cent) (?:of|over) (?:the )?control|relative to (?:the )?control",
    r"increase|decrease",
    r"response ratio|lnrr|log ratio",
)
"""The numbers compare two states already."""

INDEX = _words(r"ind(?:ex|ices)", r"scores?", r"ratings?", r"ranks?")
"""Zero may not mean none."""

SOUND_INDEX = _words(
    r"(?:leaf|plant|green|wood) area ind(?:ex|ices)", r"[lp]ai", r"harvest ind(?:ex|ices)"
)
"""Indices with a true zero."""

BOUNDED = _words(r"per ?cent(?:ages?)?", r"proportions?", r"fractions?", r"probabilit(?:y|ies)")
"""There is an upper end (so has '%')."""

RATIO = _words(r"ratios?", r"[a-z]+:[a-z]+")
"""The number is a ratio of two quantities already."""

LESS_IS_BETTER = _words(
    r"mortality|deaths?|days? to|time to|duration",
    r"damage|severity|incidence|infestation|disease|pests?|weeds?|lodging",
    r"loss(?:es)?|emissions?|leaching|erosion|run[- ]?off|residues?",
    r"failure|stress|toxicity|injur(?:y|ies)",
)
"""A larger value is usually the worse one."""

WHOLE = re.compile(
    r"(?:number|no\.?|counts?|#)(?: of [a-z]+)?|counts?|eggs|individuals|seedlings|nestlings|"
    r"fledglings",
    re.IGNORECASE,
)
"""The whole unit says that single values are whole numbers."""


def readable(text: str) -> str:
    """Text with underscores and brackets as spaces, so that words in it can be found."""
    return " ".join(re.sub(r"[_\[\]{}]+", " ", text).split())
