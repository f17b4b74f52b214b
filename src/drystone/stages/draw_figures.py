"""Figures: reads the tables of one analysis -> writes its charts as SVG, PDF and PNG."""

from __future__ import annotations

import json
import shutil
from pathlib import Path
from typing import TYPE_CHECKING

from drystone.report import facts as shown
from drystone.report.figures import save_figures
from drystone.stages.intake_store import load_table
from drystone.stages.render_report import analysis_facts
from drystone.tables import check
from drystone.tables.store import empty_table

if TYPE_CHECKING:
    from drystone.settings.model import Settings


def run(root: Path, settings: Settings, intake: Path, name: str, target: Path) -> None:
    """Write the figures of the analysis ``name`` beside ``target``, and their list to it."""
    folder = target.parent
    shutil.rmtree(folder, ignore_errors=True)
    folder.mkdir(parents=True)
    save_figures(_facts(root, settings, intake, name), folder)
    names = sorted(path.name for path in folder.iterdir())
    target.write_text(json.dumps(names, indent=1), encoding="utf-8")


def figures_folder(root: Path, name: str) -> Path:
    """Folder of the figures of one analysis in the cache."""
    return root / "cache" / "figures" / name


def _facts(root: Path, settings: Settings, intake: Path, name: str) -> shown.ReportFacts:
    """Facts without findings and ledger, which no figure shows."""
    rows = load_table(intake, "rows")
    analysis = settings.all_analyses()[name]
    return shown.ReportFacts(
        review_name="",
        made_from=shown.MadeFrom("", {}),
        settings=settings,
        flow=shown.Flow(len(rows), int(rows["study"].nunique())),
        findings=empty_table(check.FINDINGS),
        ledger=empty_table(check.LEDGER),
        derivations=empty_table(check.DERIVATIONS),
        studies=load_table(intake, "studies"),
        analyses=(analysis_facts(root, settings, intake, name, analysis),),
    )
