"""What the check writes: findings, the ledger of rows that left, derivations of SDs."""

from drystone.tables.columns import number, schema, text, whole
from drystone.words import arms, levels

FOUND = {
    "level": text("how far the row can go", required=True, allowed=levels.LEVELS),
    "rule": text("short name of the rule", required=True),
    "sheet": text("sheet of the workbook, or file of the folder"),
    "cell": text("address, such as F143; blank when the finding is about no single cell"),
    "row_id": text("row"),
    "column": text("drystone's name of the column"),
    "value": text("the cell as typed"),
    "wrong": text("what is wrong", required=True),
    "todo": text("what to do", required=True),
}

FINDINGS = schema(
    "findings",
    "one thing that the check found in one cell (or row, or column when row_id is blank)",
    FOUND,
)

ACCEPTED = schema(
    "accepted",
    "one finding that a person accepted in answers.csv",
    {
        **FOUND,
        "decision": text("what was decided", required=True),
        "reason": text("why, as typed"),
        "who": text("who decided"),
        "date": text("when, as typed"),
    },
)

LEDGER = schema(
    "ledger",
    "one row that left one analysis (under one strategy and model where these are named)",
    {
        "analysis": text("analysis; blank when the row left before any analysis"),
        "strategy": text("strategy; blank when it left under every strategy"),
        "model": text("model; blank when it left under every model"),
        "row_id": text("row", required=True),
        "study": text("study"),
        "sheet": text("sheet of the workbook, or file of the folder"),
        "sheet_row": whole("row number in that sheet"),
        "rule": text("short name of the rule", required=True),
        "reason": text("why the row left, in words", required=True),
    },
)

DERIVATIONS = schema(
    "derivations",
    "one SD that was computed from something else",
    {
        "row_id": text("row", required=True),
        "study": text("study"),
        "arm": text("arm", required=True, allowed=arms.ARMS),
        "sd": number("the SD that was used", unit="outcome unit", required=True),
        "rule": text("short name of the rule", required=True),
        "inputs": text("cells and values that went in", required=True),
        "assumptions": text("what was assumed", required=True),
    },
)
