"""What ``drystone compare-extractions`` does: two sheets in, disagreements out."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING

from drystone.driving.folders import is_review

if TYPE_CHECKING:
    import pandas as pd

    from drystone.sheet.intake import Intake

CELLS, COLUMNS = "disagreements.csv", "agreement.csv"
KEPT = ("row", "column", "a", "b")  # a resolution holds while these are the same
ROWS, WIDTH = 39, 100


@dataclass(frozen=True)
class Options:
    """How to compare.

    Parameters
    ----------
    config : config or review folder that both sheets follow; None: each its own, or guessed
    tolerance : relative difference of two numbers that is none
    target : folder for the two files
    """

    config: Path | None
    tolerance: float
    target: Path


def compare(a: Path, b: Path, options: Options, say: Callable[[str], None]) -> bool:
    """Print and write how the sheets at ``a`` and ``b`` differ; True when they do.

    Raises
    ------
    ConfigProblem, SheetProblem
        When a sheet or a config cannot be used.
    """
    from drystone.sheet.extractions.compare import agreement, disagreements
    from drystone.sheet.extractions.match import match_rows

    first, second = _intake(a, options.config), _intake(b, options.config)
    pairs = match_rows(first, second)
    cells = _with_resolutions(
        disagreements(first, second, pairs, options.tolerance), options.target / CELLS
    )
    columns = agreement(first, second, pairs, options.tolerance)
    _write(cells, options.target / CELLS)
    _write(columns, options.target / COLUMNS)
    sizes = (len(pairs), len(first.rows), len(second.rows))
    for line in _screen(cells, columns, sizes, options.target):
        say(line)
    return len(cells) > 0


def _intake(path: Path, config: Path | None) -> Intake:
    """Sheet of a review folder, or a bare sheet read by ``config`` or by guesses."""
    from drystone.driving.review import load_settings_relative, open_review
    from drystone.settings.load import load_settings, settings_from
    from drystone.sheet.guess.proposal import propose
    from drystone.sheet.intake import take_in
    from drystone.sheet.readers import read_sheet
    from drystone.sheet.sources import raw_sheet, read_sources

    if is_review(path) and config is None:
        review = open_review(path)
        settings, sheet = review.settings, review.sheet_path()
    else:
        sheet = open_review(path).sheet_path() if is_review(path) else path
        if config is None:
            sources = read_sources(sheet)
            proposal = propose(sources, sheet.name)
            content, name = proposal.settings(str(sheet)), f"the layout guessed for {sheet.name}"
            raw = raw_sheet(sources, proposal.layout, sheet.name)
            return take_in(raw, settings_from(content, name))
        settings = load_settings_relative(config) if config.is_dir() else load_settings(config)
    return take_in(read_sheet(sheet, settings.columns, settings.layout), settings)


def _with_resolutions(cells: pd.DataFrame, path: Path) -> pd.DataFrame:
    """Take over what people resolved in an earlier comparison, where the cells are the same."""
    import pandas as pd

    if not path.exists():
        return cells
    earlier = pd.read_csv(path, dtype=str, keep_default_na=False, encoding="utf-8-sig")
    if not {*KEPT, "resolution", "resolved_by"} <= set(earlier.columns):
        return cells
    known = {
        tuple(line[name].removeprefix("'") for name in KEPT): line
        for line in earlier.to_dict("records")
        if line["resolution"] or line["resolved_by"]
    }
    for place, key in enumerate(cells[list(KEPT)].itertuples(index=False, name=None)):
        line = known.get(tuple(text.removeprefix("'") for text in key))
        if line is not None:
            for name in ("resolution", "resolved_by"):
                cells.loc[place, name] = line[name]
    return cells


def _write(table: pd.DataFrame, path: Path) -> None:
    from drystone.sheet.present import findings_csv

    shown = table.copy()
    for name in shown.select_dtypes("float").columns:
        shown[name] = [_number(value) for value in shown[name]]
    findings_csv(shown, path)


def _number(value: float) -> str:
    return "" if value != value else f"{value:.6g}"


def _screen(
    cells: pd.DataFrame, columns: pd.DataFrame, sizes: tuple[int, int, int], target: Path
) -> Iterator[str]:
    """Columns with most effect on a log ratio first, one line for each."""
    pairs, first, second = sizes
    yield f"{pairs} rows stand in both sheets (A has {first}, B has {second})."
    whole = int((cells["column"] == "(whole row)").sum())
    if whole:
        yield f"{whole} rows stand in one sheet only."
    differing = columns[columns["compared"] > columns["agreeing"]]
    lines = [_column_line(cells, line) for line in differing.to_dict("records")]
    lines.sort(key=lambda item: -item[0])
    room = ROWS - 6
    for _, text in lines[:room]:
        yield text if len(text) <= WIDTH * 2 else f"{text[: WIDTH * 2 - 4]} ..."
    if len(lines) > room:
        yield f"and {len(lines) - room} more columns"
    full = len(columns) - len(differing)
    yield f"{full} column{'s agree' if full != 1 else ' agrees'} in every row."
    settled = int((cells["resolution"] != "").sum())
    yield f"{len(cells)} disagreements, {settled} resolved: {target / CELLS}"
    yield f"Agreement by column: {target / COLUMNS}"


def _or_blank(text: str) -> str:
    return text or "blank"


def _column_line(cells: pd.DataFrame, line: dict[str, object]) -> tuple[float, str]:
    mine = cells[cells["column"] == line["column"]]
    first = mine.iloc[0]  # the table begins with the largest change
    change = abs(float(first["log_ratio_change"]))
    differ = int(str(line["compared"])) - int(str(line["agreeing"]))
    kappa = float(str(line["kappa"]))
    beyond = "" if kappa != kappa else f", kappa {kappa:.2f}"
    effect = f"; changes a log ratio by up to {change:.3g}" if change > 0 else ""
    places = [
        f"{side} {first[f'cell_{side.lower()}']} {_or_blank(first[side.lower()])}" for side in "AB"
    ]
    where = ", ".join(places)
    text = (
        f"{line['column']}: {differ} of {line['compared']} differ "
        f"({float(str(line['percent'])):.1f} % agree{beyond}){effect}; {where} (row {first['row']})"
    )
    return (0.0 if change != change else change), text
