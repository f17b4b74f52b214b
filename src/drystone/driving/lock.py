"""One run at a time in a review folder.

The lock is the system's own file lock, so it is gone with the process that held it, also after
kill -9. The worker holds a second one: a run that starts while an orphaned worker still writes
waits for its end.
"""

from __future__ import annotations

import json
import os
from datetime import datetime
from pathlib import Path

from filelock import FileLock, Timeout

from drystone.driving.files import read_json

FRONT, WORKER = Path("cache") / "run.lock", Path("cache") / "worker.lock"
ORPHAN_SECONDS = 15.0
_held: list[FileLock] = []


class FolderBusy(RuntimeError):
    """Another run holds the review folder."""


def hold(root: Path) -> FileLock:
    """Take the folder for a run.

    Raises
    ------
    FolderBusy
        When another run holds it.
    OSError
        When the folder cannot be written.
    """
    lock = _take(root, FRONT, 0)
    wait_for_worker(root)
    return lock


def hold_for_process(root: Path) -> None:
    """Take the folder until this process ends; see `hold`."""
    _held.append(hold(root))


def hold_as_worker(root: Path) -> None:
    """Take the worker's lock until this process ends; see `hold`."""
    _held.append(_take(root, WORKER, ORPHAN_SECONDS))


def wait_for_worker(root: Path) -> None:
    """Wait until no orphaned worker of an earlier run writes any more; see `hold`."""
    _take(root, WORKER, ORPHAN_SECONDS).release()


def _take(root: Path, name: Path, seconds: float) -> FileLock:
    path = root / name
    path.parent.mkdir(parents=True, exist_ok=True)
    lock = FileLock(path)
    try:
        lock.acquire(timeout=seconds)
    except Timeout:
        raise FolderBusy(_who(root)) from None
    _note_holder(path)
    return lock


def _note_holder(path: Path) -> None:
    note = {"process": os.getpid(), "since": datetime.now().isoformat(timespec="seconds")}
    try:
        path.with_suffix(".json").write_text(json.dumps(note), encoding="utf-8")
    except OSError:
        return  # only a courtesy for the message of the next run


def _who(root: Path) -> str:
    note = read_json((root / FRONT).with_suffix(".json")) or {}
    who = f"process {note['process']}, since {note['since']}" if "process" in note else "unknown"
    return f"another run holds this review folder ({who}); wait for it, or stop it, and run again"
