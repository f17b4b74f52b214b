"""Write the demo's workbook and its README: an invented review of dry-stone walls.

Run from anywhere: ``python data_template/make_demo.py [FOLDER]``. Without FOLDER the files of the
repository are rewritten; the same code gives the same bytes.
"""

from __future__ import annotations

import re
import sys
from collections import Counter
from collections.abc import Callable
from pathlib import Path

from demo_numbers import TAU_ROW, TAU_STUDY, Row, rows_of
from demo_places import ASPECTS, INVENTED, OUTCOMES, QUESTION, Study, all_studies
from workbook_look import Columns, add_page, add_table, new_workbook, save_fixed

from drystone.tables import columns, comparisons, studies

HERE = Path(__file__).resolve().parent
PENDING = "Lathe Meadow 2023"

MODERATORS: Columns = {
    "wall_height_m": columns.number("height of the wall", unit="m", group="moderators"),
    "aspect": columns.text(
        "side of the wall that the strip lies on", allowed=ASPECTS, group="moderators"
    ),
}


def demo_columns() -> Columns:
    """Columns of the demo's comparisons sheet: the template's, and two moderators."""
    front = {name: comparisons.COLUMNS[name] for name in comparisons.OPEN_COLUMNS}
    return {**front, **MODERATORS, **comparisons.COLUMNS}


def comparison_rows() -> list[Row]:
    """All comparisons with their row ids and the planted flaws."""
    rows = [row for study in all_studies() for row in _with_ids(rows_of(study), study)]
    _plant(rows)
    return rows


def study_rows() -> list[Row]:
    """All studies; one waits for its full text."""
    rows: list[Row] = [
        {"study": study.name, "citation": study.citation, "year": study.year, "status": "in"}
        for study in all_studies()
    ]
    for row in rows:
        if row["study"] == PENDING:
            row["status"] = "pending"
            row["note"] = "only the abstract seen so far; numbers to be checked in the full text"
    return rows


def write_demo(folder: Path) -> None:
    """Write ``extraction.xlsx`` and ``README.md`` into ``folder``."""
    rows, sources = comparison_rows(), study_rows()
    workbook = new_workbook("Invented example: lee strips of dry-stone walls", INVENTED)
    add_page(workbook, "about", ["Lee strips of dry-stone walls", INVENTED, QUESTION])
    table = demo_columns()
    unused = [name for name in table if all(row.get(name) is None for row in rows)]
    folded = [name for name in unused if name not in comparisons.OPEN_COLUMNS]
    add_table(workbook, "comparisons", table, rows, folded)
    add_table(workbook, "studies", studies.COLUMNS, sources)
    folder.mkdir(parents=True, exist_ok=True)
    save_fixed(workbook, folder / "extraction.xlsx")
    (folder / "README.md").write_text(readme(rows, sources), encoding="utf-8")


def readme(rows: list[Row], sources: list[Row]) -> str:
    """Page beside the workbook, with its counts and the planted flaws."""
    counts = Counter(row["outcome"] for row in rows)
    uses = Counter((row["study"], row["control_id"]) for row in rows)
    shared = sum(times > 1 for times in uses.values())
    silent = sum(not _has_spread(row, arm) for row in rows for arm in ("control", "treatment"))
    truth = "\n".join(
        f"| {o.name} | {o.unit} | {counts[o.name]} | {o.mean_effect:g} | {o.per_metre:+g} | "
        + ", ".join(f"{aspect} {value:+g}" for aspect, value in o.by_aspect.items())
        + " |"
        for o in OUTCOMES.values()
    )
    flaws = "\n".join(f"| {row['row_id']} | {flaw} |" for row, flaw in flaws_in(rows))
    return _README.format(
        invented=INVENTED,
        question=QUESTION,
        rows=len(rows),
        studies=len(sources),
        species=len({row["species"] for row in rows}),
        controls=len(uses),
        shared=shared,
        silent=silent,
        slots=2 * len(rows),
        truth=truth,
        tau_study=TAU_STUDY,
        tau_row=TAU_ROW,
        flaws=flaws,
        pending=PENDING,
        pending_rows=sum(row["study"] == PENDING for row in rows),
    )


def flaws_in(rows: list[Row]) -> list[tuple[Row, str]]:
    """Rows that cannot go into the analysis as typed, and why."""
    found = []
    for row in rows:
        if row.get("exclude_reason"):
            found.append((row, f"left out by the team: {row['exclude_reason']}"))
        if row.get("treatment_mean") == 0:
            found.append((row, "mean of zero, so there is no log ratio"))
        if row.get("treatment_n") is None:
            found.append((row, "no n"))
        if row.get("treatment_sd") == 0:
            found.append((row, "SD of zero, which counts as missing"))
    return found


def _with_ids(rows: list[Row], study: Study) -> list[Row]:
    slug = re.sub(r"\W+", "-", study.name.lower())
    return [{"row_id": f"{slug}-{number}", **row} for number, row in enumerate(rows, start=1)]


def _plant(rows: list[Row]) -> None:
    """Put the flaws into rows that share no arm, each in a study of its own."""
    uses = Counter((row["study"], row["control_id"]) for row in rows)
    free = [row for row in rows if uses[row["study"], row["control_id"]] == 1]
    free = [row for row in free if row["study"] != PENDING]
    touched: set[str] = set()

    def change(fits: Callable[[Row], bool], **cells: object) -> None:
        row = next(row for row in free if row["study"] not in touched and fits(row))
        touched.add(row["study"])
        row.update(cells)

    change(
        lambda row: row["species"] == "Carabus violaceus" and "treatment_sd" not in row,
        treatment_mean=0.0,
        treatment_spread=None,
        treatment_lower=None,
        treatment_upper=None,
        treatment_spread_kind=None,
        note="none caught in the lee strip",
    )
    change(lambda row: "treatment_sd" in row and row["control_n"] == 3, treatment_sd=0.0)
    change(
        lambda row: "treatment_sd" in row and row["wall_height_m"] > 1.5,
        exclude_reason="the wall was breached in the second winter, so the strip had no shelter",
    )
    change(
        lambda row: "date" in row and row["outcome"] == "forage yield",
        exclude_reason="the two plots were cut eleven days apart",
    )
    change(
        lambda row: "treatment_sd" in row and "beetle" in row["outcome"],
        control_n=None,
        treatment_n=None,
        note="number of traps not given",
    )


def _has_spread(row: Row, arm: str) -> bool:
    return any(row.get(f"{arm}_{cell}") is not None for cell in ("sd", "spread", "lower"))


_README = """\
# Demo: lee strips of dry-stone walls

> {invented}

{question}

`extraction.xlsx` holds {rows} comparisons from {studies} studies: a strip in the lee of a wall
(treatment) against open ground of the same field (control), on {species} species. {shared} of the
{controls} controls serve several comparisons. {silent} of {slots} entries (two arms in each
comparison) come without any spread, small studies more often than large ones; the others print an
SD, a standard error, a 95 % confidence interval, a CV or a variance. `config.yaml` asks two
questions to the sheet.

The workbook and this page are made by `data_template/make_demo.py`.

## What the numbers were made with

Replicate values were drawn from log-normal distributions and then summarised and rounded as papers
do it. So the true values are known (log response ratios, at a wall of 1.4 m):

| outcome | unit | comparisons | true mean | per metre of wall | by aspect |
|---|---|---|---|---|---|
{truth}

Between studies the true values differ with an SD of {tau_study:g}, between the comparisons of a
study with an SD of {tau_row:g}. The estimates of one draw scatter around these values.

## What the check has to say something about

| row | what is the matter |
|---|---|
{flaws}

The {pending_rows} comparisons of the study {pending} wait too: its status is pending.
"""


if __name__ == "__main__":
    write_demo(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE / "demo")
