"""Write the empty extraction workbook and the column guide from the table schemas.

Run from anywhere: ``python data_template/make_template.py [FOLDER]``. Without FOLDER the files of
the repository are rewritten; the same code gives the same bytes.
"""

from __future__ import annotations

import sys
from dataclasses import dataclass
from pathlib import Path

from openpyxl import Workbook
from openpyxl.styles import Alignment, Font
from workbook_look import (
    ON_DARK,
    REQUIRED,
    WRAPPED,
    Columns,
    add_page,
    add_table,
    allowed_in,
    new_workbook,
    save_fixed,
    unit_of,
)

from drystone.tables import comparisons, studies

HERE = Path(__file__).resolve().parent
TABLES: dict[str, Columns] = {"comparisons": comparisons.COLUMNS, "studies": studies.COLUMNS}

ADVICE = (
    "Type what the paper prints: an SD into control_sd and treatment_sd; anything else into "
    "control_spread and treatment_spread, with its kind beside it. Never convert by hand.",
    "A confidence interval: type its limits into control_lower and control_upper (and the same for "
    "the treatment), and choose the kind CI.",
    "One spread for both arms (LSD, MSE, SED ...): pooled_spread and pooled_kind, with error_df "
    "for an LSD or HSD. A t, F or exact p of the two arms: test_value and test_kind.",
    "A median: type it in the column of the mean, choose the centre's kind, and type quartiles, "
    "smallest and largest value where the paper has them. Means of logarithms likewise, with the "
    "spread of the logarithms.",
    "A control that serves several comparisons: the same control_id and the same numbers in each "
    "of their rows.",
    "Leave a cell blank when the paper is silent. A blank is honest; a zero is a number.",
    "Never delete a row: write the reason into exclude_reason and it stays out of every analysis.",
    "Moderators: add columns of your own, to the right of the last one or anywhere between, and "
    "name them in the formulas of config.yaml.",
    "Do not rename columns here; when your team's names differ, list them under columns: in "
    "config.yaml.",
)
HELP_HEADER = ("sheet", "column", "group", "what", "unit", "allowed values", "required")
HELP_WIDTHS = (13, 26, 24, 70, 22, 60, 10)
FOLDED = tuple(name for name in comparisons.COLUMNS if name not in comparisons.OPEN_COLUMNS)


@dataclass(frozen=True)
class Guide:
    """One column as the guide and the help sheet describe it."""

    sheet: str
    column: str
    group: str
    what: str
    unit: str
    allowed: str
    required: str

    def cells(self) -> tuple[str, ...]:
        """Cells in the order of `HELP_HEADER`."""
        return tuple(vars(self).values())


def guide() -> list[Guide]:
    """Every column of every sheet, in order."""
    return [
        Guide(
            sheet,
            name,
            "" if sheet == "studies" else str(column.metadata["group"]),
            str(column.description),
            unit_of(column),
            "; ".join(allowed_in(column)),
            "" if column.nullable else "yes",
        )
        for sheet, columns in TABLES.items()
        for name, column in columns.items()
    ]


def column_guide() -> str:
    """Markdown page with all columns, sheet by sheet and group by group."""
    lines = [
        "# Columns of the extraction workbook",
        "",
        "Made by `data_template/make_template.py` from the schemas in `src/drystone/tables/`.",
        "Columns marked * are required. The sheet `comparisons` has one row for each comparison of",
        "a treatment arm with a control arm, the sheet `studies` one row for each study.",
        "",
        *(f"- {line}" for line in ADVICE),
    ]
    headings: dict[str, list[str]] = {}
    for item in guide():
        heading = f"{item.sheet}: {item.group}" if item.group else item.sheet
        star = "*" if item.required else ""
        row = f"| `{item.column}`{star} | {item.what} | {item.unit} | {item.allowed} |"
        headings.setdefault(heading, []).append(row)
    for heading, rows in headings.items():
        lines += ["", f"## {heading}", "", "| column | what | unit | allowed values |"]
        lines += ["|---|---|---|---|", *rows]
    return "\n".join(lines) + "\n"


def template() -> Workbook:
    """Return the empty workbook: comparisons, studies, help."""
    workbook = new_workbook(
        "Extraction sheet", "Empty template; the sheet help describes the columns."
    )
    add_table(workbook, "comparisons", comparisons.COLUMNS, folded=FOLDED)
    add_table(workbook, "studies", studies.COLUMNS)
    _add_help(workbook)
    return workbook


def write_template(folder: Path) -> None:
    """Write ``extraction.xlsx`` and ``columns.md`` into ``folder``."""
    folder.mkdir(parents=True, exist_ok=True)
    save_fixed(template(), folder / "extraction.xlsx")
    (folder / "columns.md").write_text(column_guide(), encoding="utf-8")


def _add_help(workbook: Workbook) -> None:
    sheet = add_page(workbook, "help", ["How to fill in this workbook"])
    sheet["A1"].alignment = Alignment(wrap_text=False)
    for line in ADVICE:
        sheet.append([line])
    sheet.append([])
    sheet.append(list(HELP_HEADER))
    for cell in sheet[sheet.max_row]:
        cell.font, cell.fill = ON_DARK, REQUIRED
    for item in guide():
        sheet.append(list(item.cells()))
        for cell in sheet[sheet.max_row]:
            cell.alignment = WRAPPED
        sheet.cell(sheet.max_row, 2).font = Font(name="Calibri", bold=bool(item.required))
        longest = max(len(item.what) / HELP_WIDTHS[3], len(item.allowed) / HELP_WIDTHS[5])
        sheet.row_dimensions[sheet.max_row].height = 16 * (1 + int(1.1 * longest))
    for letter, width in zip("ABCDEFG", HELP_WIDTHS, strict=True):
        sheet.column_dimensions[letter].width = width


if __name__ == "__main__":
    write_template(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE)
