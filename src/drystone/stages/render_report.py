"""Report: reads all cached tables -> writes one offline HTML page."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

from drystone.report import facts as shown
from drystone.report.page import render_page
from drystone.stages import collect
from drystone.stages.intake_store import load_table
from drystone.stages.versions import versions
from drystone.tables.atomic import write_text
from drystone.tables.store import read_table

if TYPE_CHECKING:
    from drystone.settings.model import Analysis, Settings


def run(root: Path, settings: Settings, intake: Path, run_id: str) -> None:
    """Write ``cache/report/report.html``."""
    page = render_page(gather(root, settings, intake, run_id))
    write_text(root / "cache" / "report" / "report.html", page)


def gather(root: Path, settings: Settings, intake: Path, run_id: str) -> shown.ReportFacts:
    """Facts of the report, from the cached tables."""
    rows = load_table(intake, "rows")
    return shown.ReportFacts(
        review_name=settings.title or root.resolve().name,
        made_from=shown.MadeFrom(run_id, versions()),
        settings=settings,
        flow=shown.Flow(len(rows), int(rows["study"].nunique())),
        findings=load_table(intake, "findings"),
        ledger=collect.whole_ledger(root, settings, intake),
        derivations=collect.whole_derivations(root, settings, intake),
        studies=load_table(intake, "studies"),
        analyses=tuple(
            analysis_facts(root, settings, intake, name, analysis)
            for name, analysis in settings.all_analyses().items()
        ),
        demo=settings.invented,
    )


def analysis_facts(
    root: Path, settings: Settings, intake: Path, name: str, analysis: Analysis
) -> shown.AnalysisFacts:
    """Facts of one analysis, from the cached tables."""
    folder = collect.analysis_folder(root, name)
    return shown.AnalysisFacts(
        name=name,
        settings=analysis,
        slice=collect.shown_slice(root, name, intake),
        effects=read_table(folder / "effects.parquet"),
        strategies=tuple(
            _strategy(root, settings, name, analysis, strategy)
            for strategy in settings.all_strategies()
        ),
        side_by_side=read_table(folder / "side_by_side.parquet"),
        elsewhere=collect.elsewhere(load_table(intake, "rows"), analysis, settings),
    )


def _strategy(
    root: Path, settings: Settings, name: str, analysis: Analysis, strategy: str
) -> shown.StrategyFacts:
    folder = collect.analysis_folder(root, name) / strategy
    models = []
    for model, formula in analysis.models.items():
        parts = ("coefficients", "components", "heterogeneity")
        tables = (read_table(folder / model / f"{part}.parquet") for part in parts)
        models.append(shown.ModelFacts(model, formula, *tables))
    return shown.StrategyFacts(
        name=strategy,
        settings=settings.all_strategies()[strategy],
        sampling=read_table(folder / "sampling.parquet"),
        covariance=read_table(folder / "covariance.parquet"),
        averages=read_table(folder / "averages.parquet"),
        models=tuple(models),
    )
