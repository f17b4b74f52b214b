"""Times of whole runs, as ratios within this one process' lifetime; prints a table.

    python tests/benchmarks/bench_runs.py

The review: invented rows, four outcomes, three strategies, one model each: about 40 jobs. Beside
it the same graph of jobs that only touch their outputs, through the same engine, and the computing
time of the steps without the engine.
"""

from __future__ import annotations

import shutil
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import numpy as np
import pandas as pd
import yaml

REPEATS = 3


def invented_rows(outcomes: int, rows: int) -> pd.DataFrame:
    """Invented comparisons: a quarter of the SDs missing, studies of five rows."""
    chance = np.random.default_rng(20261201)
    parts = []
    for outcome in range(outcomes):
        mean = chance.uniform(5, 20, rows)
        sd = 0.25 * mean * chance.uniform(0.6, 1.5, rows)
        part = pd.DataFrame({"row_id": [f"O{outcome}R{number}" for number in range(rows)]})
        part["study"] = [f"Place {number // 5}" for number in range(rows)]
        part["outcome"] = f"outcome {outcome}"
        part["control_mean"], part["control_n"] = mean.round(3), 5
        part["control_sd"] = np.where(chance.random(rows) < 0.25, np.nan, sd.round(3))
        part["treatment_mean"] = (mean * np.exp(chance.normal(0.1, 0.2, rows))).round(3)
        part["treatment_sd"] = part["control_sd"] * 1.1
        part["treatment_n"] = 5
        parts.append(part)
    return pd.concat(parts, ignore_index=True)


def write_review(root: Path, outcomes: int, rows: int) -> None:
    """Review folder with the invented rows."""
    (root / "data/extraction").mkdir(parents=True)
    (root / "config").mkdir()
    invented_rows(outcomes, rows).to_csv(root / "data/extraction/comparisons.csv", index=False)
    names = {f"outcome {number}": {} for number in range(outcomes)}
    config = {"sheet": "data/extraction", "outcomes": names}
    (root / "config/config.yaml").write_text(yaml.safe_dump(config))


def seconds(command: list[str], folder: Path) -> float:
    """Wall time of a command that must succeed."""
    begun = time.perf_counter()
    subprocess.run(command, cwd=folder, check=True, capture_output=True)
    return time.perf_counter() - begun


def touch_workflow(root: Path, target: Path) -> int:
    """Snakefile with the review's graph of jobs, each of which touches its outputs."""
    from drystone.driving.plan import make_plan

    steps = make_plan(root).steps
    lines = ["rule all:", f"    input: {[p for s in steps.values() for p in s.outputs]}"]
    for number, step in enumerate(steps.values()):
        above = [path for name in step.upstream for path in steps[name].outputs]
        lines += [
            f"rule step_{number}:",
            f"    input: {above}",
            f"    output: {list(step.outputs)}",
        ]
        lines += ["    run:", "        for path in output: open(path, 'w').close()"]
    (target / "Snakefile").write_text("\n".join(lines))
    return len(steps)


def computing_seconds(root: Path) -> float:
    """Time of all steps one after the other in this process, imports done before."""
    from drystone.driving.perform import perform
    from drystone.driving.plan import make_plan

    total = 0.0
    for attempt in range(2):  # the first pass loads the libraries
        shutil.rmtree(root / "cache", ignore_errors=True)
        plan = make_plan(root)
        begun = time.perf_counter()
        for name in plan.steps:
            perform(plan, name)
        total = time.perf_counter() - begun if attempt else total
    return total


def main() -> None:
    """Measure and print."""
    python, drystone = sys.executable, [sys.executable, "-m", "drystone"]
    with tempfile.TemporaryDirectory() as base:
        root, touched = Path(base) / "review", Path(base) / "touched"
        root.mkdir()
        touched.mkdir()
        write_review(root, 3, 120)
        jobs = touch_workflow(root, touched)
        engine = [python, "-m", "snakemake", "--cores", "2", "--force-use-threads", "--quiet"]
        runs, touches, idle, versions = [], [], [], []
        for _ in range(REPEATS):
            for folder in (root / "cache", root / "results", touched / "cache"):
                shutil.rmtree(folder, ignore_errors=True)
            shutil.rmtree(touched / ".snakemake", ignore_errors=True)
            touches.append(seconds(engine, touched))
            runs.append(seconds([*drystone, "run", str(root)], root))
            idle.append(seconds([*drystone, "run", str(root)], root))
            versions.append(seconds([python, "-m", "snakemake", "--version"], root))
        computing = computing_seconds(root)
    run, touch, nothing, version = (min(times) for times in (runs, touches, idle, versions))
    print(f"jobs                                       {jobs}")
    print(f"whole run                                  {run:6.2f} s")
    print(f"the same graph of touch                    {touch:6.2f} s")
    print(f"computing time of the steps                {computing:6.2f} s")
    print(f"(run - computing) / touch   target <= 3    {(run - computing) / touch:6.2f}")
    print(f"nothing to do                              {nothing:6.2f} s")
    print(f"snakemake --version                        {version:6.2f} s")
    print(f"nothing / version           target <= 2.5  {nothing / version:6.2f}")


if __name__ == "__main__":
    main()
