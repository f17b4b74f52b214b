"""Write the flawed twin of the demo: the same invented review, full of what reviews get wrong.

Run from anywhere: ``python data_template/make_flawed_twin.py [FOLDER]``. Without FOLDER the files
of the repository are rewritten; the same code gives the same bytes. The answer key says what was
planted where, and which rule of the check should speak.
"""

from __future__ import annotations

import csv
import re
import sys
from collections.abc import Iterator
from pathlib import Path

from demo_numbers import Row
from demo_places import INVENTED
from flawed_rows import EXTRAS, Flaw, edits
from make_demo import comparison_rows, demo_columns, study_rows
from workbook_look import add_page, add_table, new_workbook, save_fixed

from drystone.tables import comparisons, studies

HERE = Path(__file__).resolve().parent
KEY_COLUMNS = ("row_id", "column", "outcome", "code", "done", "rule", "also")
REPRINT = "Wallend Report 2008"


def flawed_sheet() -> tuple[list[Row], list[Row], list[Row]]:
    """Comparisons, studies and answer key of the twin."""
    rows, sources = comparison_rows(), study_rows()
    clean = {row["row_id"]: dict(row) for row in rows}
    flaws = edits(clean)
    by_id = {row["row_id"]: row for row in rows}
    for flaw in flaws:
        by_id[flaw.row_id].update(flaw.cells)
    key = [_answer(flaw) for flaw in flaws if flaw.code]
    for row, answer in (*_copies(clean), *_extras()):
        rows += [row] if row else []
        key += [answer] if answer else []
    sources.append(
        {
            "study": REPRINT,
            "citation": f"Invented record for the demo: {REPRINT}, a station report",
            "year": 2008,
            "status": "in",
        }
    )
    return rows, sources, key


def write_flawed_twin(folder: Path) -> None:
    """Write workbook, config, answer key and page into ``folder``."""
    rows, sources, key = flawed_sheet()
    workbook = new_workbook("Invented example: lee strips, with planted flaws", INVENTED)
    add_page(workbook, "about", ["Lee strips of dry-stone walls, with planted flaws", INVENTED])
    table = demo_columns()
    unused = [name for name in table if all(row.get(name) is None for row in rows)]
    folded = [name for name in unused if name not in comparisons.OPEN_COLUMNS]
    add_table(workbook, "comparisons", table, rows, folded)
    add_table(workbook, "studies", studies.COLUMNS, sources)
    folder.mkdir(parents=True, exist_ok=True)
    save_fixed(workbook, folder / "extraction.xlsx")
    with (folder / "answer_key.csv").open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, KEY_COLUMNS, lineterminator="\n")
        writer.writeheader()
        writer.writerows(key)
    (folder / "config.yaml").write_text(_config(), encoding="utf-8")
    codes = len({answer["code"] for answer in key})
    page = _README.format(invented=INVENTED, rows=len(rows), flaws=len(key), codes=codes)
    (folder / "README.md").write_text(page, encoding="utf-8")


def _answer(flaw: Flaw, outcome: str = "") -> Row:
    return {
        "row_id": flaw.row_id,
        "column": flaw.column,
        "outcome": outcome,
        "code": flaw.code,
        "done": flaw.done,
        "rule": flaw.rule,
        "also": "; ".join(flaw.also),
    }


def _copies(clean: dict[str, Row]) -> Iterator[tuple[Row | None, Row | None]]:
    """Rows that stand twice, a chain, a second date."""
    for number in (1, 2, 3):
        row = clean[f"sikefold-2007-{number}"]
        yield {**row, "row_id": f"wallend-report-2008-{number}", "study": REPRINT}, None
    yield (
        None,
        _answer(
            Flaw(
                "wallend-report-2008-1",
                "study",
                "E24",
                "same trial in two studies",
                "a station report with the trial of Sikefold 2007",
            )
        ),
    )
    copy = {**clean["blackrigg-hush-2021-2"], "row_id": "blackrigg-hush-2021-3"}
    flaw = Flaw(copy["row_id"], "treatment_mean", "E24", "repeated row", "a row pasted twice")
    yield copy, _answer(flaw)
    yield _chain(clean)
    later = {
        **clean["hollin-fell-2009-3"],
        "row_id": "hollin-fell-2009-7",
        "date": "summer 2008",
        "control_mean": 16.9,
        "treatment_mean": 14.8,
    }
    flaw = Flaw(later["row_id"], "date", "E33", "several dates", "the next year of the same plots")
    yield later, _answer(flaw)


def _chain(clean: dict[str, Row]) -> tuple[Row, Row]:
    """Add a row whose control is the treatment of another row, without names for either."""
    first = clean["yowden-2013-1"]
    arm = {f"control_{what}": first[f"treatment_{what}"] for what in ("mean", "sd", "n")}
    row = {
        **first,
        **arm,
        "row_id": "yowden-2013-4",
        "control_id": None,
        "control_label": first["treatment_label"],
        "treatment_id": "lee-F9",
        "treatment_label": "lee strip between two walls",
        "treatment_mean": 18.26,
        "treatment_sd": 3.37,
    }
    flaw = Flaw(
        "yowden-2013-4",
        "control_mean",
        "E4",
        "chained arms",
        "the treatment of another row is the control, without its name",
    )
    return row, _answer(flaw)


def _extras() -> Iterator[tuple[Row | None, Row | None]]:
    for extra in EXTRAS:
        for study, *numbers in extra.numbers:
            row: Row = {
                "row_id": re.sub(r"\W+", "-", f"{study} {extra.outcome}".lower()),
                "study": study,
                "site": "lower intake",
                "species": "Trifolium repens",
                "outcome": extra.outcome,
                "unit": extra.unit,
                "control_label": "open ground, 60 m or more from any wall",
                "treatment_label": "lee strip",
                **extra.cells,
            }
            names = [f"{arm}_{what}" for arm in ("control", "treatment") for what in _PARTS]
            yield {**row, **dict(zip(names, numbers, strict=True))}, None
        if extra.flaw:
            yield None, _answer(extra.flaw, extra.outcome)
        for flaw in extra.flaws:
            yield None, _answer(flaw)


_PARTS = ("mean", "sd", "n")


def _config() -> str:
    """Give the demo's config, with the outcomes that the twin adds."""
    lines = (HERE / "demo" / "config.yaml").read_text(encoding="utf-8").splitlines()
    added = [f"  {extra.outcome}: {{unit: '{extra.unit}'}}" for extra in EXTRAS]
    at = lines.index("analyses:") - 1
    while lines[at - 1].startswith("#") or not lines[at - 1]:
        at -= 1
    title = "title: Lee strips of dry-stone walls, with planted flaws"
    lines = [title if line.startswith("title:") else line for line in lines]
    return "\n".join([*lines[:at], *added, *lines[at:]]) + "\n"


_README = """\
# Flawed twin of the demo

> {invented}

`extraction.xlsx` is the demo's sheet ({rows} comparisons) after a careless month: {flaws} flaws
of {codes} kinds, each in the disguise in which reviews meet it. `answer_key.csv` says what was done
where, under which code, and which rule of `drystone check` should speak:

| column | holds |
|---|---|
| row_id | row of the finding; blank when it is about an outcome as a whole |
| column, outcome | where the finding points |
| code | kind of the flaw |
| done | what was done |
| rule, also | rule that should speak; others that speak because of the same flaw |

Workbook, config, key and this page are made by `data_template/make_flawed_twin.py`; a test
compares the check with the key and counts what is caught, missed and alarmed in vain.
"""


if __name__ == "__main__":
    write_flawed_twin(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE / "demo" / "flawed")
