"""One run at a time."""

from __future__ import annotations

import subprocess
import sys

import pytest

from drystone.driving.lock import FolderBusy, hold


def test_second_run_is_refused_and_told_who_holds(tmp_path):
    with hold(tmp_path):
        script = (
            "import sys; from pathlib import Path; from drystone.driving.lock import *\n"
            "try:\n    hold(Path(sys.argv[1]))\nexcept FolderBusy as busy:\n    print(busy)\n"
        )
        done = subprocess.run(
            [sys.executable, "-c", script, str(tmp_path)],
            capture_output=True,
            text=True,
            check=True,
        )
    assert "another run holds this review folder (process " in done.stdout


def test_lock_is_free_after_the_run(tmp_path):
    with hold(tmp_path):
        pass
    with hold(tmp_path):
        pass


def test_lock_of_a_dead_process_is_free(tmp_path):
    script = (
        "import os, sys; from pathlib import Path; from drystone.driving.lock import hold\n"
        "hold(Path(sys.argv[1])); os.kill(os.getpid(), 9)"
    )
    done = subprocess.run([sys.executable, "-c", script, str(tmp_path)], check=False)
    assert done.returncode == -9
    try:
        hold(tmp_path).release()
    except FolderBusy:
        pytest.fail("the lock of a killed process was still held")
