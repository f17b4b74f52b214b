"""Tables whose headers stand in several lines, or not in the first filled row.

The texts of the header lines are joined, a group's name being carried to the columns that it
spans: over 'mean' and 'SD' stands 'Control', so the columns are called 'Control mean' and
'Control SD'.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from dataclasses import replace

from drystone.settings.model import Layout
from drystone.sheet.grid import Grid, header_text, table_from_grid
from drystone.sheet.notes import Note
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import Broken, RawTable, letters
from drystone.words import levels


def laid_out_table(
    name: str, grid: Grid, broken: dict[tuple[int, int], Broken], file: str, layout: Layout
) -> tuple[RawTable, list[Note]]:
    """Table of ``grid`` with the header lines of ``layout``; see `grid.table_from_grid`.

    Raises
    ------
    SheetProblem
        When the table is empty or ends above the header lines.
    """
    first = (layout.header_row or _first_filled(grid)) - 1
    last = first + layout.header_rows - 1
    if last >= len(grid):
        raise SheetProblem(
            f"ends above row {last + 1}, where 'layout' in the config looks for the headers",
            file,
            name,
        )
    names, notes = distinct(join_lines(grid, first, layout.header_rows))
    below: Grid = [*([] for _ in range(last)), names, *grid[last + 1 :]]
    kept = {place: cell for place, cell in broken.items() if place[0] > last}
    table, more = table_from_grid(name, below, kept, file)
    return table, [*(replace(note, sheet=name) for note in notes), *more]


def join_lines(grid: Grid, first: int, count: int) -> list[str]:
    """Header of every column: its texts in ``count`` lines from row ``first``, from 0, joined."""
    width = max((len(grid[i]) for i in range(first, first + count)), default=0)
    lines = [_line(grid[i], width) for i in range(first, first + count)]
    for number in range(len(lines) - 1):
        lines[number] = _carried(lines[number], lines[number + 1 :])
    return [" ".join(dict.fromkeys(filter(None, parts))) for parts in zip(*lines, strict=True)]


def distinct(names: Sequence[str]) -> tuple[list[str], list[Note]]:
    """Names with the column's letters behind a name that stands more than once."""
    counts = Counter(name for name in names if name)
    found = [
        f"{name} (column {letters(place)})" if counts[name] > 1 else name
        for place, name in enumerate(names)
    ]
    notes = [
        Note(
            levels.WARN,
            "repeated header",
            f"{count} columns are called '{name}'; they are told apart by their letters, as in "
            f"'{found[names.index(name)]}'",
            "give every column a name of its own",
            value=name,
        )
        for name, count in counts.items()
        if count > 1
    ]
    return found, notes


def _first_filled(grid: Grid) -> int:
    return next((i for i, row in enumerate(grid, start=1) if any(map(header_text, row))), 1)


def _line(row: Sequence[object], width: int) -> list[str]:
    texts = [header_text(cell) for cell in row]
    return texts + [""] * (width - len(texts))


def _carried(line: list[str], below: list[list[str]]) -> list[str]:
    """Carry a group's name to the right, over columns that have a name below but none beside.

    A name without a text below is a column of its own and spans nothing. The last group spans no
    more columns than the one before, since the columns after it may belong to no group.
    """
    found, spans = list(line), [0]
    starts = [place for place, text in enumerate(line) if text]
    for start, end in zip(starts, [*starts[1:], len(line)], strict=True):
        if not any(lower[start] for lower in below):
            continue
        stop = start + 1
        while stop < end and any(lower[stop] for lower in below):
            stop += 1
        if end == len(line) and spans[-1]:
            stop = min(stop, start + spans[-1])
        found[start:stop] = [line[start]] * (stop - start)
        spans.append(stop - start)
    return found
