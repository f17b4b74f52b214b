"""Everything that is guessed about one sheet."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from functools import partial
from typing import Any

from drystone.settings.model import Layout, folder_name
from drystone.sheet.guess import vocabulary as known
from drystone.sheet.guess.arm_columns import ArmColumns, Guess, arm_columns
from drystone.sheet.guess.codebook import Codebook
from drystone.sheet.guess.fields import Field, fields_of
from drystone.sheet.guess.header_lines import find_lines
from drystone.sheet.guess.outcomes import OutcomeGuess, guess_outcomes
from drystone.sheet.guess.pairs import Arms, find_arms
from drystone.sheet.guess.row_columns import row_columns
from drystone.sheet.headers import plain
from drystone.sheet.laid_out import laid_out_table
from drystone.sheet.problems import SheetProblem
from drystone.sheet.raw import RawTable
from drystone.sheet.sources import Source
from drystone.tables.comparisons import COLUMNS
from drystone.words import arms, scales


@dataclass(frozen=True)
class Proposal:
    """A guess for every part of the config that a sheet can suggest.

    Parameters
    ----------
    layout : sheet and header lines
    columns : guesses that hold, in the order of our columns
    spare : columns that could stand in for one of ours
    spread_kind : what a spread is, when no SD is there; blank otherwise
    outcomes : most frequent first
    asks : what a person must decide
    moderators : headers that stay as they are
    rows : rows of the table
    codebook : True when another sheet explained headers
    """

    layout: Layout
    columns: tuple[Guess, ...]
    spare: tuple[Guess, ...]
    spread_kind: str
    outcomes: tuple[OutcomeGuess, ...]
    asks: tuple[str, ...]
    moderators: tuple[str, ...]
    rows: int
    codebook: bool = field(default=False)

    def settings(self, sheet: str) -> dict[str, Any]:
        """Config that says what was guessed; ``sheet`` is where the file stands."""
        content: dict[str, Any] = {
            "sheet": sheet,
            "layout": self.layout.model_dump(exclude_defaults=True),
            "columns": {guess.ours: guess.theirs for guess in self.columns},
            "outcomes": {
                item.name: {"scale": item.scale, **({"unit": item.unit} if item.unit else {})}
                for item in self.outcomes
            },
        }
        if self.spread_kind:
            content["defaults"] = {"spread_kind": self.spread_kind}
        if _clash([item.name for item in self.outcomes]):
            content["analyses"] = self.analyses()
        return content

    def analyses(self) -> dict[str, dict[str, str]]:
        """One numbered analysis for each ratio-scale outcome, where their names would clash."""
        ratio = [item.name for item in self.outcomes if item.scale == scales.RATIO]
        return {
            f"{number} {folder_name(name)}"[:60].strip(" ."): {"outcome": name}
            for number, name in enumerate(ratio, start=1)
        }


def propose(sources: Sequence[Source], file: str) -> Proposal:
    """Guess which sheet holds the comparisons, and what its columns mean.

    Raises
    ------
    SheetProblem
        When no sheet has two columns that can be the means of the arms, or none names the study.
    """
    best: tuple[float, Layout, Source] | None = None
    for source in sources:
        book = Codebook(other.grid for other in sources if other is not source)
        score, layout = find_lines(source.name, source.grid, partial(_judge, book=book))
        if best is None or score > best[0]:
            best = (score, layout, source)
    if best is None or best[0] <= 0:
        raise SheetProblem(_nothing(sources), file)
    return _propose(best[2], best[1], sources, file)


def _propose(source: Source, layout: Layout, sources: Sequence[Source], file: str) -> Proposal:
    table, _ = laid_out_table(source.name, source.grid, source.broken, file, layout)
    book = Codebook(other.grid for other in sources if other is not source)
    codebook = book.describe(table.headers)
    fields, found, columns, guesses = _guesses(table, codebook)
    if found is None or columns is None:
        raise SheetProblem(_nothing(sources), file)
    by_ours = {guess.ours: fields[guess.place] for guess in guesses}
    asks = [*columns.asks]
    if "study" not in by_ours:
        raise SheetProblem(_no_study(table), file, source.name)
    if "outcome" not in by_ours:
        asks.append(
            "no column says what was measured; all rows count as one outcome, 'outcome'. Name the "
            "column in the map, or rename the outcome"
        )
    size = len(table.row_numbers)
    unit = found.means[arms.CONTROL].unit or found.means[arms.TREATMENT].unit
    used = {guess.place for guess in guesses}
    spare = {guess.place for guess in columns.spare}
    order = list(COLUMNS)
    return Proposal(
        layout=layout if len(sources) > 1 else layout.model_copy(update={"sheet": None}),
        columns=tuple(sorted(guesses, key=lambda guess: order.index(guess.ours))),
        spare=columns.spare,
        spread_kind="" if "control_spread_kind" in by_ours else columns.spread_kind,
        outcomes=tuple(guess_outcomes(by_ours, size, unit)),
        asks=tuple(asks),
        moderators=tuple(f.header for f in fields if f.place not in used | spare),
        rows=size,
        codebook=bool(codebook),
    )


def _guesses(
    table: RawTable, codebook: dict[str, str]
) -> tuple[list[Field], Arms | None, ArmColumns | None, list[Guess]]:
    fields = fields_of(table, codebook)
    ready = _already_ours(fields)
    found = find_arms(fields)
    columns = arm_columns(fields, found) if found else None
    by_arm = [*columns.used] if columns else []
    taken = {guess.place for guess in (*ready, *by_arm, *(columns.spare if columns else ()))}
    study = next((fields[guess.place] for guess in ready if guess.ours == "study"), None)
    rows = row_columns(fields, taken, study)
    chosen: dict[str, Guess] = {}
    for guess in (*ready, *by_arm, *rows):
        if guess.ours not in chosen:
            chosen[guess.ours] = guess
    return fields, found, columns, list(chosen.values())


def _already_ours(fields: Sequence[Field]) -> list[Guess]:
    """Headers that are ours already, whatever their words would suggest."""
    ours = {plain(name): name for name in COLUMNS}
    names = [(ours.get(plain(field.header)), field) for field in fields]
    return [
        Guess(name, field.header, "drystone's own name", field.place)
        for name, field in names
        if name is not None
    ]


def _judge(table: RawTable, book: Codebook) -> tuple[float, tuple[int, ...]]:
    """Score of a table: what its headers explain; and where its numbers stand."""
    fields, found, columns, guesses = _guesses(table, book.describe(table.headers))
    if found is None or columns is None:
        return 0.0, ()
    numbers = [guess for guess in columns.used if fields[guess.place].quantity in known.QUANTITIES]
    twins = sum("(column " in header for header in table.headers)
    filled = min(mean.shape.filled for mean in found.means.values())
    score = 2.0 * len(columns.used) + len(guesses) + 3.0 * found.told - twins
    score += sum(guess.ours == "study" for guess in guesses) * 3.0 + min(filled, 10) / 10
    places = tuple(table.positions[guess.place] for guess in numbers)
    return max(score, 0.1), places


def _clash(names: Sequence[str]) -> bool:
    """Whether two outcomes would share the folder of their analysis."""
    folders = [folder_name(name).casefold() for name in names]
    return len(set(folders)) < len(folders)


def _nothing(sources: Sequence[Source]) -> str:
    listed = ", ".join(f"'{source.name}'" for source in sources[:6]) or "nothing"
    return (
        "no two columns look like the means of a control and a treatment arm (looked at "
        f"{listed}); the headers should say so, as in 'control mean' and 'treatment mean', with "
        "one row for each comparison; or map them under 'columns' in a config (`drystone start`)"
    )


def _no_study(table: RawTable) -> str:
    return (
        "the means were found, but no column names the study; add one with a header such as "
        f"'study' (the headers are {', '.join(repr(h) for h in table.headers[:12])})"
    )
