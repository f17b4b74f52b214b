"""Replaces results/ as a whole: the new folder is complete before the old one moves.

An interruption between the two moves leaves the old folder under a name from which the next run
takes it back.
"""

from __future__ import annotations

import os
import shutil
from pathlib import Path

NEW, OLD = ".results-new", ".results-old"


def swap(root: Path) -> None:
    """Put the new results where the old ones were."""
    results, old = root / "results", root / OLD
    if results.exists():
        os.replace(results, old)
    os.replace(root / NEW, results)
    clear(old)


def clear(path: Path) -> None:
    """Remove a file or folder, or nothing."""
    if path.is_dir() and not path.is_symlink():
        shutil.rmtree(path, ignore_errors=True)
    else:
        path.unlink(missing_ok=True)


def recover(root: Path) -> bool:
    """Take back the old results after an interruption between two moves; True when that was so."""
    results, old = root / "results", root / OLD
    if not old.exists():
        return False
    if results.exists() or not old.is_dir():
        clear(old)
        return False
    os.replace(old, results)
    return True
