"""Where the marked copy goes: its name, and another one while the first is open elsewhere."""

from __future__ import annotations

import os
import re
from collections.abc import Callable, Iterator
from pathlib import Path

MOST_COPIES = 99
LONGEST_STEM = 100  # characters of the original's name, so that the whole stays a file name


def copy_name(sheet: Path, number: int = 1) -> str:
    """File name of the marked copy of ``sheet``; from 2 on it is numbered."""
    stem = (sheet.stem if sheet.suffix else sheet.name)[:LONGEST_STEM]
    return f"{stem} marked.xlsx" if number == 1 else f"{stem} marked {number}.xlsx"


def is_open(path: Path) -> bool:
    """Whether a spreadsheet program has left the file beside ``path`` that says it is open."""
    return any(lock.exists() for lock in lock_files(path))


def lock_files(path: Path) -> tuple[Path, ...]:
    """Files that spreadsheet programs keep beside an open workbook."""
    return (path.with_name(f".~lock.{path.name}#"), path.with_name(f"~${path.name}"))


def is_lock(path: Path) -> bool:
    """Whether a spreadsheet program keeps ``path`` beside an open workbook."""
    return path.name.startswith((".~lock.", "~$"))


def put(write: Callable[[Path], object], folder: Path, sheet: Path) -> Path:
    """Let ``write`` make the copy and move it into ``folder`` in one move.

    Earlier numbered copies go, unless they are open. A copy that is open keeps its content, and
    the new one stands beside it under a number.

    Raises
    ------
    OSError
        When the folder cannot be written at all.
    """
    folder.mkdir(parents=True, exist_ok=True)
    partial = folder / f".marked.{os.getpid()}.part"
    try:
        write(partial)
        target = _move(partial, folder, sheet)
    finally:
        partial.unlink(missing_ok=True)
    for old in _numbered(folder, sheet):
        if old != target and not is_open(old):
            _remove(old)
    return target


def open_copies(folder: Path, sheet: Path) -> list[Path]:
    """Marked copies of ``sheet`` in ``folder`` that are open in a spreadsheet program."""
    first = folder / copy_name(sheet)
    found = [first, *_numbered(folder, sheet)]
    return [path for path in found if path.exists() and is_open(path)]


def _move(partial: Path, folder: Path, sheet: Path) -> Path:
    refused: OSError | None = None
    for number in range(1, MOST_COPIES + 1):
        target = folder / copy_name(sheet, number)
        if is_open(target):
            continue
        try:
            os.replace(partial, target)
        except PermissionError as error:  # some systems refuse to replace an open file
            refused = error
            continue
        return target
    raise refused or OSError(f"{MOST_COPIES} marked copies are open; close some and check again")


def _numbered(folder: Path, sheet: Path) -> Iterator[Path]:
    stem = re.escape(copy_name(sheet).removesuffix(".xlsx"))
    pattern = re.compile(rf"{stem} \d{{1,2}}\.xlsx")
    return (path for path in sorted(folder.glob("*.xlsx")) if pattern.fullmatch(path.name))


def _remove(path: Path) -> None:
    try:
        path.unlink(missing_ok=True)
    except PermissionError:
        return  # open after all; it stays until the next check
