"""Publish: reads the cache -> replaces results/ as a whole, the manifest written last.

See `drystone.stages.swap_folders` for what an interruption leaves.
"""

from __future__ import annotations

import hashlib
import json
import shutil
from datetime import UTC, datetime
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np
import pandas as pd

from drystone.maths.log_ratio import percent_change
from drystone.sheet.marked_copy.target import lock_files, open_copies, put
from drystone.stages import collect
from drystone.stages.draw_figures import figures_folder
from drystone.stages.swap_folders import NEW, clear, recover, swap
from drystone.stages.versions import versions
from drystone.tables.csv_store import write_csv
from drystone.tables.store import read_table

if TYPE_CHECKING:
    from drystone.settings.model import Settings

FINDINGS = Path("check") / "findings.csv"
ACCEPTED = Path("check") / "accepted.csv"
SUMMARY = (
    *("analysis", "strategy", "model", "coefficient", "estimate", "se", "df"),
    *("ci_low", "ci_high", "p", "se_model", "pi_low", "pi_high"),
    *("percent", "percent_ci_low", "percent_ci_high", "rows", "studies"),
)


def run(root: Path, settings: Settings, intake: Path, run_id: str, inputs: dict[str, str]) -> None:
    """Replace ``results/`` and write ``cache/published.json``.

    Parameters
    ----------
    inputs : SHA-256 of sheet and config as they were read, which may be older than the files
    """
    recover(root)
    new = root / NEW
    clear(new)
    new.mkdir()
    write_csv(summary_table(root, settings), new / "summary.csv")
    _write_tables(root, settings, intake, new)
    _put_marked_copy(root, settings, new / FINDINGS.parent)
    shutil.copyfile(root / "cache" / "report" / "report.html", new / "report.html")
    for name in settings.all_analyses():
        left_out = shutil.ignore_patterns("list.json")
        folder = figures_folder(root, name)
        shutil.copytree(folder, new / "figures", ignore=left_out, dirs_exist_ok=True)
    manifest = _manifest(new, run_id, inputs)
    (new / "manifest.json").write_text(json.dumps(manifest, indent=1), encoding="utf-8")
    swap(root)
    stamp = root / "cache" / "published.json"
    stamp.write_text(json.dumps({"run": run_id}), encoding="utf-8")


def _put_marked_copy(root: Path, settings: Settings, target: Path) -> None:
    """Publish the marked copy, beside an older one that is open in a spreadsheet program.

    The open one and the file that says so come along, since the program will save to that place.
    """
    sheet, made = root / settings.sheet, root / "cache" / "check" / "marked.xlsx"
    for copy in open_copies(root / "results" / target.name, sheet):
        for path in (copy, *lock_files(copy)):
            if path.exists():
                shutil.copyfile(path, target / path.name)
    put(lambda partial: shutil.copyfile(made, partial), target, sheet)


def summary_table(root: Path, settings: Settings) -> pd.DataFrame:
    """One row per analysis x strategy x model x coefficient, refused models with their reason."""
    parts = []
    for place in collect.places(root, settings):
        table = place.table("coefficients")
        table.insert(0, "analysis", place.analysis)
        table.insert(1, "strategy", place.strategy)
        table.insert(2, "model", place.model)
        for name, value in _components(place).items():
            table[f"var_{name}"] = value
        parts.append(table)
    table = pd.concat(parts, ignore_index=True)
    for target, source in (
        ("percent", "estimate"),
        ("percent_ci_low", "ci_low"),
        ("percent_ci_high", "ci_high"),
    ):
        table[target] = percent_change(table[source].to_numpy(float))
    levels = [name for name in table.columns if name.startswith("var_")]
    return table[[*SUMMARY, *levels, "log_likelihood", "refused"]]


def _components(place: collect.Place) -> dict[str, float]:
    table = place.table("components")
    found = dict(zip(table["level"], table["variance"], strict=True))
    return {level: float(found.get(level, np.nan)) for level in ("study", "row")}


def _write_tables(root: Path, settings: Settings, intake: Path, target: Path) -> None:
    check = root / "cache" / "check"
    write_csv(read_table(check / "findings.parquet"), target / FINDINGS)
    tables = target / "tables"
    write_csv(read_table(check / "findings.parquet"), tables / "findings.csv")
    write_csv(read_table(check / "accepted.parquet"), tables / "accepted.csv")
    write_csv(read_table(check / "accepted.parquet"), target / ACCEPTED)
    derivations = collect.whole_derivations(root, settings, intake)
    write_csv(derivations, tables / "derivations.csv")
    write_csv(collect.whole_ledger(root, settings, intake), tables / "ledger.csv")
    for name in settings.all_analyses():
        folder = collect.analysis_folder(root, name)
        rows = collect.shown_slice(root, name, intake)
        effects = read_table(folder / "effects.parquet").drop(columns="study")
        write_csv(rows.merge(effects, on="row_id"), tables / name / "effects.csv")
        write_csv(read_table(folder / "side_by_side.parquet"), tables / name / "side by side.csv")
        for part in ("sampling", "covariance", "averages"):
            joined = _over_strategies(folder, settings, part)
            write_csv(joined, tables / name / f"{part}.csv")
        for part in ("components", "heterogeneity"):
            write_csv(_over_models(root, settings, name, part), tables / name / f"{part}.csv")


def _over_strategies(folder: Path, settings: Settings, part: str) -> pd.DataFrame:
    tables = []
    for strategy in settings.all_strategies():
        table = read_table(folder / strategy / f"{part}.parquet")
        table.insert(0, "strategy", strategy)
        tables.append(table)
    return pd.concat(tables, ignore_index=True)


def _over_models(root: Path, settings: Settings, name: str, part: str) -> pd.DataFrame:
    tables = []
    for place in collect.places(root, settings):
        if place.analysis == name:
            table = place.table(part)
            table.insert(0, "strategy", place.strategy)
            table.insert(1, "model", place.model)
            tables.append(table)
    return pd.concat(tables, ignore_index=True)


def _manifest(folder: Path, run_id: str, inputs: dict[str, str]) -> dict[str, object]:
    """Record of the run; ``check/`` is left out, because the check rewrites it by itself."""
    files = sorted(path for path in folder.rglob("*") if path.is_file())
    names = {path.relative_to(folder).as_posix(): path for path in files}
    return {
        "run": run_id,
        "published": datetime.now(UTC).isoformat(timespec="seconds"),
        "versions": versions(),
        "inputs": inputs,
        "files": {
            name: _sha256(path) for name, path in names.items() if not name.startswith("check/")
        },
    }


def _sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()
