"""What is wrong with a config, said so that it can be mended."""

from __future__ import annotations

import difflib
from collections.abc import Iterable

MOST_NAMED = 15


class ConfigProblem(ValueError):
    """A config that cannot be used.

    Parameters
    ----------
    message : what is wrong and what to do
    name : which file
    line : where in it, from 1
    """

    def __init__(self, message: str, name: str = "", line: int | None = None) -> None:
        where = name if line is None else f"{name}, line {line}"
        super().__init__(f"{where}: {message}" if where else message)
        self.line = line


def nearest(word: str, known: Iterable[str]) -> str:
    """Phrase that names the known word nearest to ``word``, or lists all of them."""
    options = sorted(known)
    close = difflib.get_close_matches(word, options, n=1, cutoff=0.6)
    if close:
        return f"did you mean '{close[0]}'?"
    more = ", ..." if len(options) > MOST_NAMED else ""
    return "known here: " + ", ".join(f"'{option}'" for option in options[:MOST_NAMED]) + more
