"""Names of analyses, strategies and models become folders, so they must be safe and distinct."""

from __future__ import annotations

import re
import unicodedata
from collections.abc import Iterable

_SAFE = re.compile(r"[^\W_][\w .\-]*", re.UNICODE)
_RESERVED = {"con", "prn", "aux", "nul", "side_by_side", "sensitivity", "rehearsal"} | {
    f"{port}{digit}" for port in ("com", "lpt") for digit in range(10)
}
LONGEST = 60
_FILES = (".parquet", ".csv", ".json")  # endings of files that lie beside these folders


def check_name(name: str, what: str) -> str:
    """Return ``name`` in NFC when it can be a folder's name.

    Raises
    ------
    ValueError
        When it is blank, too long, reserved, ends in a dot or space, or holds another character
        than letters, digits, space, dash, dot and underscore.
    """
    plain = unicodedata.normalize("NFC", name)
    if not _SAFE.fullmatch(plain) or plain.endswith((".", " ")) or ".." in plain:
        raise ValueError(
            f"{what} '{name}' cannot be a folder's name: use letters, digits, space, dash, dot "
            "and underscore, begin with a letter or digit, end without dot or space"
        )
    if plain.casefold().endswith(_FILES):
        raise ValueError(f"{what} '{name}' ends like a file of the results; choose another name")
    if plain.casefold().split(".")[0] in _RESERVED or len(plain) > LONGEST:
        raise ValueError(
            f"{what} '{name}' is reserved or longer than {LONGEST} characters; choose another name"
        )
    return plain


def check_distinct(names: Iterable[str], what: str) -> None:
    """Refuse two names that some file systems could not tell apart.

    Raises
    ------
    ValueError
        When two names are equal after NFC and case folding.
    """
    seen: dict[str, str] = {}
    for name in names:
        key = unicodedata.normalize("NFC", name).casefold()
        if key in seen:
            raise ValueError(
                f"{what} '{seen[key]}' and '{name}' would share a folder; rename one of them"
            )
        seen[key] = name
