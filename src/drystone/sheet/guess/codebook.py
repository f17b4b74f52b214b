"""Sheets that describe the columns of another sheet."""

from __future__ import annotations

from collections.abc import Iterable, Sequence

from drystone.sheet.grid import Grid, header_text
from drystone.sheet.headers import plain

FEWEST = 3  # headers that a sheet must describe to count as a codebook
SHARE = 0.3  # of the described sheet's headers
LONGEST = 500  # rows; a longer sheet holds data
FIRST_COLUMNS = 5  # where the described names are looked for


class Codebook:
    """What the sheets of a file say beside a name, if one of them is a codebook.

    A codebook has a column that lists the headers, and their meaning beside it in the same row.
    """

    def __init__(self, grids: Iterable[Grid]) -> None:
        self._columns = [
            meanings
            for grid in grids
            if len(grid) <= LONGEST
            for meanings in _by_column([[header_text(cell) for cell in row] for row in grid])
        ]

    def describe(self, headers: Sequence[str]) -> dict[str, str]:
        """Description of each of ``headers``; none when too few of them are described."""
        wanted = {plain(header): header for header in headers if header}
        best: dict[str, str] = {}
        for meanings in self._columns:
            found = {wanted[name]: meanings[name] for name in wanted if name in meanings}
            if len(found) > len(best):
                best = found
        return best if len(best) >= max(FEWEST, SHARE * len(wanted)) else {}


def _by_column(rows: Sequence[Sequence[str]]) -> Iterable[dict[str, str]]:
    width = max(map(len, rows), default=0)
    for column in range(min(width, FIRST_COLUMNS)):
        meanings: dict[str, str] = {}
        for row in rows:
            name = plain(row[column]) if column < len(row) else ""
            beside = " ".join(text for i, text in enumerate(row) if i != column and text)
            if name and beside:
                meanings.setdefault(name, beside)
        yield meanings
