"""Check: reads the stored intake -> writes findings, ledger, derivations and studies."""

from __future__ import annotations

from pathlib import Path

from drystone.stages.intake_store import load_table
from drystone.tables import check, studies
from drystone.tables.store import write_table

SCHEMAS = {
    "findings": check.FINDINGS,
    "accepted": check.ACCEPTED,
    "ledger": check.LEDGER,
    "derivations": check.DERIVATIONS,
    "studies": studies.SCHEMA,
}


def run(intake: Path, target: Path) -> None:
    """Write the check's tables to the folder ``target``, each against its schema."""
    for name, schema in SCHEMAS.items():
        write_table(load_table(intake, name), target / f"{name}.parquet", schema)
