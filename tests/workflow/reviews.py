"""Writes small reviews and runs them, for the workflow tests."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import yaml
from reference.formula_sheet import sheet

from drystone.driving.front import Outcome, run
from drystone.driving.plan import make_plan
from drystone.driving.why import Reason, reasons

REFERENCE = Path(__file__).resolve().parents[1] / "reference"
SHARED = Path(__file__).resolve().parents[3] / "shared" / "data"


def write_review(root: Path, rows: pd.DataFrame, config: dict, studies=None) -> Path:
    """Review with the sheet as a folder of CSV files."""
    folder = root / "data" / "extraction"
    folder.mkdir(parents=True)
    (root / "config").mkdir()
    rows.to_csv(folder / "comparisons.csv", index=False)
    if studies is not None:
        studies.to_csv(folder / "studies.csv", index=False)
    write_config(root, {"sheet": "data/extraction", **config})
    return root


def write_config(root: Path, config: dict) -> None:
    text = yaml.safe_dump(config, sort_keys=False, allow_unicode=True)
    (root / "config" / "config.yaml").write_text(text, encoding="utf-8")


def run_review(root: Path) -> Outcome:
    """Run and insist that nothing failed."""
    outcome = run(root, 2, lambda plan: None, lambda event: None)
    assert not outcome.failures, outcome.failures
    return outcome


def explained(root: Path) -> list[Reason]:
    return reasons(make_plan(root))


def summary(root: Path) -> pd.DataFrame:
    return pd.read_csv(root / "results" / "summary.csv")


def mini_sheet() -> pd.DataFrame:
    """The twelve invented rows of the formula sheet, in the columns of the template."""
    rows = pd.DataFrame(sheet()["rows"], columns=sheet()["columns"])
    return pd.DataFrame(
        {
            "row_id": rows["row"],
            "study": rows["study"],
            "outcome": "biomass",
            "species": rows["species"],
            "year": rows["year"],
            "treatment_id": rows["arm_t"],
            "control_id": rows["arm_c"],
            "control_mean": rows["mean_c"],
            "control_sd": rows["sd_c"],
            "control_n": rows["n_c"],
            "treatment_mean": rows["mean_t"],
            "treatment_sd": rows["sd_t"],
            "treatment_n": rows["n_t"],
        }
    )
