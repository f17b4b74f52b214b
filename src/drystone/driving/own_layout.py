"""A sheet in the team's own layout: checked without a config, or put into a new review folder."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable, Iterator
from pathlib import Path

from drystone.driving.folders import start_from
from drystone.sheet.guess.config_text import config_text
from drystone.sheet.guess.proposal import Proposal, propose
from drystone.sheet.guess.screen import ROWS, finding_lines, guess_lines
from drystone.sheet.sources import raw_sheet, read_sources
from drystone.words.levels import STOP

WRITABLE = 0o222  # a folder that nobody may write to is left alone even by those who could
FIRST_WORDS = "level,rule,"  # of a findings file of ours, which may be replaced


def check_sheet(path: Path, say: Callable[[str], None]) -> bool:
    """Guess the layout of the sheet at ``path``, print guesses and findings; True on a stop.

    All findings go to a CSV file beside the sheet, or into the present folder (or the system's
    folder for temporary files) where nothing may be written.

    Raises
    ------
    SheetProblem, ConfigProblem
        When the sheet cannot be read or its columns cannot be guessed.
    """
    from drystone.settings.load import settings_from
    from drystone.sheet.intake import take_in
    from drystone.sheet.present import collapse, findings_csv

    sources = read_sources(path)
    proposal = propose(sources, path.name)
    settings = settings_from(proposal.settings(str(path)), f"the layout guessed for {path.name}")
    intake = take_in(raw_sheet(sources, proposal.layout, path.name), settings)
    head = guess_lines(proposal, path.name)
    target = _write(lambda place: findings_csv(intake.findings, place), path)
    left = intake.ledger["sheet_row"].nunique()
    tail = [
        f"{len(intake.rows)} rows: {len(intake.rows) - left} usable, {left} cannot be used.",
        f"All findings with their cells: {target}",
        f"To correct the guesses and go on: drystone start FOLDER --sheet {path}",
    ]
    room = ROWS - len(head) - len(tail)
    for line in (*head, *finding_lines(collapse(intake.findings), room), *tail):
        say(line)
    return bool((intake.findings["level"] == STOP).any())


def start_with_sheet(folder: Path, path: Path) -> Proposal:
    """Write a review folder around a copy of the sheet at ``path``, with the guessed config.

    Raises
    ------
    FolderTaken
        When ``folder`` exists and is not empty; nothing is written then.
    SheetProblem
        When the sheet cannot be read or its columns cannot be guessed; nothing is written then.
    """
    proposal = propose(read_sources(path), path.name)
    name = "extraction" if path.is_dir() else path.name
    start_from(folder, path, name, config_text(proposal, f"data/{name}", path.name))
    return proposal


def _write(write: Callable[[Path], None], sheet: Path) -> Path:
    """Write to the first of the places that takes it; the last failure is the user's to see."""
    *others, last = _places(sheet)
    for place in others:
        try:
            write(place)
            return place
        except OSError:
            continue
    write(last)
    return last


def _places(sheet: Path) -> Iterator[Path]:
    stem = sheet.name if sheet.is_dir() else sheet.stem
    for folder in (sheet.resolve().parent, Path.cwd(), Path(tempfile.gettempdir())):
        if folder.is_dir() and os.access(folder, os.W_OK) and folder.stat().st_mode & WRITABLE:
            yield _free(folder, f"{stem}-findings")
    yield Path(tempfile.gettempdir()) / f"{stem}-findings.csv"


def _free(folder: Path, stem: str) -> Path:
    """Place under a name that is free, or holds earlier findings."""
    path, number = folder / f"{stem}.csv", 1
    while path.exists() and not _is_ours(path):
        number += 1
        path = folder / f"{stem}-{number}.csv"
    return path


def _is_ours(path: Path) -> bool:
    try:
        with path.open(encoding="utf-8-sig") as stream:
            return stream.readline().startswith(FIRST_WORDS)
    except (OSError, ValueError):
        return False
