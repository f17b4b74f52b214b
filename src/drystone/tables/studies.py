"""The studies sheet: one row = one study."""

from drystone.tables.columns import RECORD, number, schema, text

STATUSES = ("in", "pending", "corrected", "retracted")
STATUSES_LEFT_OUT = ("pending", "retracted")

COLUMNS = {
    "study": text("short name, as in the comparisons sheet", required=True),
    "citation": text("reference as it should be printed", use=RECORD),
    "year": number("year of publication", unit="year"),
    "doi": text("digital object identifier", use=RECORD),
    "status": text(
        "in, pending, corrected or retracted; pending and retracted studies stay out",
        allowed=STATUSES,
    ),
    "note": text("anything else", use=RECORD),
}
SCHEMA = schema("studies", "one study", COLUMNS)
