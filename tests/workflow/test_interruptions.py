"""Killed, interrupted, crowded out: the next run completes, the last good results stay."""

from __future__ import annotations

import os
import random
import shutil
import signal
import subprocess
import sys
import time
from pathlib import Path

import pandas as pd
import pytest
from workflow.reviews import mini_sheet, run_review, write_review

CONFIG = {"outcomes": {"biomass": None}, "analyses": {"biomass": {"outcome": "biomass"}}}


def _start(root: Path, *words: str) -> subprocess.Popen:
    return subprocess.Popen(
        [sys.executable, "-m", "drystone", "run", str(root), *words],
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
    )


def _finish(root: Path) -> subprocess.CompletedProcess:
    command = [sys.executable, "-m", "drystone", "run", str(root)]
    return subprocess.run(command, capture_output=True, text=True, check=False, timeout=120)


@pytest.fixture(scope="module")
def good(tmp_path_factory):
    """A finished review, how long it took, and its summary."""
    root = write_review(tmp_path_factory.mktemp("good"), mini_sheet(), CONFIG)
    begun = time.monotonic()
    run_review(root)
    return root, time.monotonic() - begun, (root / "results/summary.csv").read_bytes()


def _fresh(root: Path, target: Path) -> Path:
    """Copy of the review without anything computed."""
    shutil.copytree(root / "data", target / "data")
    shutil.copytree(root / "config", target / "config")
    return target


def test_kill_nine_at_random_moments(good, tmp_path):
    """Ten kills of the front process; an orphaned worker must not go on writing."""
    root, seconds, summary = good
    fresh, chance = _fresh(root, tmp_path / "review"), random.Random(20261201)
    for _ in range(10):
        process = _start(fresh)
        time.sleep(chance.uniform(0.2, max(1.0, seconds)))
        process.send_signal(signal.SIGKILL)
        process.communicate()
        shutil.rmtree(fresh / "cache" / chance.choice(["done", "check", "none"]), True)
    done = _finish(fresh)
    assert (done.returncode, "Traceback" in done.stderr) == (0, False), done.stderr
    assert (fresh / "results/summary.csv").read_bytes() == summary


def test_kill_nine_of_the_worker(good, tmp_path):
    root, _, summary = good
    fresh = _fresh(root, tmp_path / "review")
    process = _start(fresh)
    worker = _wait_for_child(process.pid)
    os.kill(worker, signal.SIGKILL)
    _, said = process.communicate(timeout=60)
    assert process.returncode == 1
    assert "ended from outside" in said
    assert _finish(fresh).returncode == 0
    assert (fresh / "results/summary.csv").read_bytes() == summary


def _wait_for_child(pid: int) -> int:
    path = Path(f"/proc/{pid}/task/{pid}/children")
    for _ in range(3000):
        children = path.read_text().split() if path.exists() else []
        if children:
            time.sleep(0.5)
            return int(children[0])
        time.sleep(0.02)
    raise AssertionError("no worker was started")


def test_interrupts_end_with_130_and_the_next_run_completes(good, tmp_path):
    root, seconds, summary = good
    fresh, chance = _fresh(root, tmp_path / "review"), random.Random(7)
    for _ in range(5):
        process = _start(fresh)
        time.sleep(chance.uniform(1.0, max(1.5, seconds * 0.7)))
        if process.poll() is not None:
            process.communicate()
            shutil.rmtree(fresh / "cache")
            continue
        process.send_signal(signal.SIGINT)
        _, said = process.communicate(timeout=120)
        assert process.returncode in (0, 130), said  # 0 when it had just finished
        assert "Traceback" not in said
    assert _finish(fresh).returncode == 0
    assert (fresh / "results/summary.csv").read_bytes() == summary


def test_two_runs_at_once_second_ends_with_4(good, tmp_path):
    root, _, summary = good
    fresh = _fresh(root, tmp_path / "review")
    first = _start(fresh)
    while not (fresh / "cache/run.json").exists():
        time.sleep(0.02)
    second = _finish(fresh)
    first.communicate(timeout=120)
    assert (first.returncode, second.returncode) == (0, 4)
    assert f"process {first.pid}" in second.stderr
    assert (fresh / "results/summary.csv").read_bytes() == summary


def test_failing_stage_keeps_the_last_good_results(good, tmp_path):
    """A folder where a file should go makes one step fail; the sentence names the step."""
    root, _, summary = good
    fresh = tmp_path / "review"
    shutil.copytree(root, fresh)
    report = fresh / "results/report.html"
    before = report.read_bytes()
    rows = pd.read_csv(fresh / "data/extraction/comparisons.csv")
    rows.loc[0, "control_mean"] = 11
    rows.to_csv(fresh / "data/extraction/comparisons.csv", index=False)
    blocked = fresh / "cache/analyses/biomass/effects.parquet"
    blocked.unlink()
    (blocked / "in the way").mkdir(parents=True)
    (blocked / "in the way" / "file").write_text("x")
    failed = _finish(fresh)
    assert failed.returncode == 1
    assert "Traceback" not in failed.stderr
    assert "The last good results stay" in failed.stderr
    assert report.read_bytes() == before
    assert (fresh / "results/summary.csv").read_bytes() == summary
    shutil.rmtree(blocked)
    assert _finish(fresh).returncode == 0


def test_interrupted_swap_takes_the_old_results_back(good, tmp_path):
    root, _, _ = good
    fresh = tmp_path / "review"
    shutil.copytree(root, fresh)
    (fresh / "results").rename(fresh / ".results-old")
    done = _finish(fresh)
    assert done.returncode == 0
    assert "the old results are back" in done.stderr
    assert (fresh / "results/report.html").exists()


needs_mount = pytest.mark.skipif(
    os.geteuid() != 0 or shutil.which("mount") is None, reason="mounting needs root"
)


@pytest.fixture
def disk(tmp_path):
    """A file system of 60 MB of its own."""
    folder = tmp_path / "disk"
    folder.mkdir()
    made = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", "size=60m", "tmpfs", str(folder)],
        capture_output=True,
        check=False,
    )
    if made.returncode != 0:
        pytest.skip("mounting is not allowed here")
    yield folder
    subprocess.run(["mount", "-o", "remount,rw", str(folder)], check=False)
    subprocess.run(["umount", "-l", str(folder)], check=False)


def _edited(root: Path) -> None:
    path = root / "data/extraction/comparisons.csv"
    rows = pd.read_csv(path)
    rows["control_mean"] *= 1.01
    rows.to_csv(path, index=False)


def _fill(folder: Path, leave: int) -> None:
    with (folder / "filler").open("wb") as file:
        while (free := shutil.disk_usage(folder).free) > leave:
            file.write(b"x" * max(1, min(1 << 20, free - leave)))
            file.flush()


@needs_mount
@pytest.mark.parametrize("leave", [48_000, 0])
def test_full_disk_is_said_and_results_stay(good, disk, leave):
    root, _, summary = good
    fresh = disk / "review"
    shutil.copytree(root, fresh)
    _edited(fresh)
    _fill(disk, leave)
    failed = _finish(fresh)
    assert failed.returncode == 1
    assert "kB are free on the disk" in failed.stderr
    assert "Traceback" not in failed.stderr
    assert (fresh / "results/summary.csv").read_bytes() == summary
    (disk / "filler").unlink()
    assert _finish(fresh).returncode == 0


@needs_mount
@pytest.mark.parametrize("leave", [400_000, 48_000, 0])
def test_disk_that_fills_during_the_run(good, disk, leave, monkeypatch):
    """The look at the free space before the start is switched off, so the steps meet the wall."""
    root, _, summary = good
    fresh = disk / "review"
    shutil.copytree(root, fresh)
    _edited(fresh)
    _fill(disk, leave)
    script = (
        "import sys; from drystone.driving import front; front.SPACE_NEEDED = 0;"
        "from drystone.cli import main; sys.argv = ['drystone', 'run', sys.argv[1]]; main()"
    )
    failed = subprocess.run(
        [sys.executable, "-c", script, str(fresh)], capture_output=True, text=True, check=False
    )
    assert failed.returncode == 1, failed.stdout
    assert "Traceback" not in failed.stderr
    assert "space" in failed.stderr
    assert (fresh / "results/summary.csv").read_bytes() == summary
    (disk / "filler").unlink()
    assert _finish(fresh).returncode == 0


@needs_mount
def test_read_only_folder_is_said(good, disk):
    root, _, summary = good
    fresh = disk / "review"
    shutil.copytree(root, fresh)
    _edited(fresh)
    subprocess.run(["mount", "-o", "remount,ro", str(disk)], check=True)
    failed = _finish(fresh)
    assert failed.returncode == 1
    assert "read-only" in failed.stderr
    assert "Traceback" not in failed.stderr
    why = subprocess.run(
        [sys.executable, "-m", "drystone", "why", str(fresh)],
        capture_output=True,
        text=True,
        check=False,
    )
    assert "Traceback" not in why.stderr
    assert (fresh / "results/summary.csv").read_bytes() == summary
