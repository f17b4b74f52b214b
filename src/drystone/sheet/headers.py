"""Which column of the team's table holds what."""

from __future__ import annotations

import re
from collections.abc import Iterable, Mapping, Sequence

from drystone.settings.problems import nearest
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawTable

_BETWEEN = re.compile(r"[\W_]+")
ALWAYS_NEEDED = ("study", "control_mean", "treatment_mean")


def plain(name: str) -> str:
    """Name without case, spaces and underscores: 'Control mean' and control_mean are equal."""
    return _BETWEEN.sub("", name).casefold()


def match_headers(
    table: RawTable, ours: Sequence[str], columns: Mapping[str, str], file: str
) -> dict[str, int]:
    """Place in ``table.headers`` of each of ``ours`` that the table has.

    Parameters
    ----------
    columns : the config's map, ours: theirs; wins over a header that equals our name

    Raises
    ------
    SheetProblem
        When a header stands twice, two headers mean the same column, or the map names an unknown
        column.
    """
    _refuse_twins(table, file)
    mapped = {
        name: _mapped_place(table, ours, name, theirs, file) for name, theirs in columns.items()
    }
    found: dict[str, int] = {}
    known = {plain(name): name for name in ours}
    for place, header in enumerate(table.headers):
        name = known.get(plain(header))
        if name is None or name in mapped or place in mapped.values():
            continue
        if name in found:
            raise SheetProblem(
                f"'{table.headers[found[name]]}' ({table.header_address(found[name])}) and "
                f"'{header}' ({table.header_address(place)}) both read as {name}; rename one, or "
                f"say which one it is under 'columns' in the config",
                file,
                table.name,
            )
        found[name] = place
    return {**found, **mapped}


def require(table: RawTable, found: Mapping[str, int], needed: Iterable[str], file: str) -> None:
    """Refuse a table that lacks a needed column.

    Raises
    ------
    SheetProblem
        With the missing columns and the header nearest to the first of them.
    """
    missing = [name for name in needed if name not in found]
    if not missing:
        return
    hint = nearest(missing[0], table.headers) if table.headers else "the table has no header"
    raise SheetProblem(
        f"has no column {' and no column '.join(missing)}; add it, or name the team's own header "
        f"in the config, as 'columns: {{{missing[0]}: ...}}' ({hint})",
        file,
        table.name,
    )


def has_needed(table: RawTable, columns: Mapping[str, str]) -> bool:
    """Whether the headers hold the columns that every comparisons table needs."""
    headers = {plain(header) for header in table.headers}
    return all(plain(columns.get(name, name)) in headers for name in ALWAYS_NEEDED)


def _refuse_twins(table: RawTable, file: str) -> None:
    seen: dict[str, int] = {}
    for place, header in enumerate(table.headers):
        if header in seen:
            raise SheetProblem(
                f"the header '{header}' stands twice, in {table.header_address(seen[header])} and "
                f"{table.header_address(place)}; rename one of them",
                file,
                table.name,
            )
        seen[header] = place


def _mapped_place(table: RawTable, ours: Sequence[str], name: str, theirs: str, file: str) -> int:
    if name not in ours:
        raise SheetProblem(
            f"the config's 'columns' maps '{name}', which is no column of drystone: "
            f"{nearest(name, ours)}",
            file,
        )
    wanted = " ".join(theirs.split())
    if wanted in table.headers:
        return table.headers.index(wanted)
    alike = [i for i, header in enumerate(table.headers) if plain(header) == plain(theirs)]
    if len(alike) == 1:
        return alike[0]
    raise SheetProblem(
        f"the config's 'columns' reads {name} from '{theirs}', but the sheet has no such header: "
        f"{nearest(theirs, table.headers)}",
        file,
        table.name,
    )
