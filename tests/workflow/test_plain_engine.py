"""Plain snakemake in a started folder, other working directories, odd paths, use as a module."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest
from workflow.reviews import explained, mini_sheet, run_review, write_review

from drystone.driving import folders
from drystone.driving.bundled import snakefile

CONFIG = {"outcomes": {"biomass": None}, "strategies": ["complete cases", "all cases"]}


def _snakemake(root: Path, *words: str) -> subprocess.CompletedProcess:
    return subprocess.run(
        [sys.executable, "-m", "snakemake", *words],
        cwd=root,
        capture_output=True,
        text=True,
        check=False,
        timeout=300,
    )


@pytest.fixture
def started(tmp_path) -> Path:
    """A started folder in a path with spaces and accents, filled with the twelve rows."""
    root = tmp_path / "revue à jour" / "l'été"
    folders.start(root)
    (root / "data/extraction.xlsx").unlink()
    (root / "config/config.yaml").unlink()
    (root / "config").rmdir()
    (root / "data").rmdir()
    return write_review(root, mini_sheet(), CONFIG)


def test_plain_snakemake_and_drystone_agree(started):
    first = _snakemake(started)
    assert first.returncode == 0, first.stderr
    summary = (started / "results/summary.csv").read_bytes()
    assert explained(started) == []
    assert run_review(started).ran == []
    again = _snakemake(started, "--dry-run")
    assert "Nothing to be done" in again.stdout + again.stderr
    path = started / "data/extraction/comparisons.csv"
    path.write_text(path.read_text().replace("13.2", "13.3", 1))
    expected = [reason.step for reason in explained(started)]
    dry = _snakemake(started, "--dry-run")
    listed = (dry.stdout + dry.stderr).count("reason: ")
    assert listed == len(expected) + 1  # and the target rule
    assert run_review(started).ran
    assert (started / "results/summary.csv").read_bytes() != summary


def test_plain_snakemake_without_threads(started):
    """Without the profile each job is a process of its own, which parses everything again."""
    words = ("--cores", "2", "--workflow-profile", "none", "--snakefile", str(snakefile()))
    done = _snakemake(started, *words)
    assert done.returncode == 0, done.stderr
    assert explained(started) == []


def test_plain_snakemake_says_what_is_wrong(started):
    (started / "config/config.yaml").write_text("sheet: data/extraction\noutcomes: {a: {unitt: x}}")
    done = _snakemake(started)
    assert done.returncode == 1
    assert "did you mean 'unit'?" in done.stdout + done.stderr
    assert "Traceback" not in done.stdout + done.stderr


def test_run_from_another_directory(started, tmp_path):
    elsewhere = tmp_path / "elsewhere"
    elsewhere.mkdir()
    relative = os.path.relpath(started, elsewhere)
    done = subprocess.run(
        [sys.executable, "-m", "drystone", "run", relative],
        cwd=elsewhere,
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    assert done.stdout.strip().endswith("results/report.html")
    assert (elsewhere / done.stdout.strip()).exists()
    assert list(elsewhere.iterdir()) == []


def test_demo_folder_is_a_review(tmp_path):
    folders.write_demo(tmp_path / "demo")
    assert folders.is_review(tmp_path / "demo")
    with pytest.raises(folders.FolderTaken):
        folders.write_demo(tmp_path / "demo")


def test_workflow_as_a_module_takes_its_config(started):
    """Another workflow can use drystone's rules and pass the settings itself."""
    (started / "config/config.yaml").unlink()
    (started / "Snakefile").write_text(
        "module review:\n"
        f"    snakefile: {str(snakefile())!r}\n"
        "    config: {'sheet': 'data/extraction', 'outcomes': {'biomass': {}}, "
        "'strategies': ['all cases']}\n\n"
        "use rule * from review as review_*\n\n"
        "rule everything:\n    default_target: True\n    input: rules.review_all.input\n"
    )
    done = _snakemake(started)
    assert done.returncode == 0, done.stderr
    assert (started / "results/report.html").exists()
