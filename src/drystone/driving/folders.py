"""Writes review folders: an empty one to fill, or the invented demo."""

from __future__ import annotations

import shutil
from pathlib import Path

from drystone.driving.bundled import bundled
from drystone.tables.atomic import write_text

SNAKEFILE = """\
# Plain `snakemake` works here too; `drystone run` is the same with one progress display.
from drystone.driving.bundled import snakefile
include: str(snakefile())
rule review: input: rules.all.input
"""

IGNORED = """\
cache/
.snakemake/
.results-new/
.results-old/
"""


class FolderTaken(ValueError):
    """The folder holds something already."""


def start(folder: Path) -> None:
    """Write an empty review: config, workbook template, and what plain snakemake needs.

    Raises
    ------
    FolderTaken
        When ``folder`` exists and is not empty; nothing is written then.
    """
    template = bundled("data_template")
    _write(folder, template / "config.yaml", template / "extraction.xlsx")


def write_demo(folder: Path) -> None:
    """Write the invented demo; see `start`."""
    template = bundled("data_template") / "demo"
    _write(folder, template / "config.yaml", template / "extraction.xlsx")
    shutil.copyfile(template / "README.md", folder / "README.md")


def start_from(folder: Path, sheet: Path, name: str, config: str) -> None:
    """Write a review around a copy of ``sheet`` (a file, or a folder of CSV files).

    Parameters
    ----------
    name : what the copy is called in the folder data
    config : text of the config

    Raises
    ------
    FolderTaken
        When ``folder`` exists and is not empty; nothing is written then.
    """
    _prepare(folder)
    _copy_sheet(sheet, folder / "data" / name)
    write_text(folder / "config" / "config.yaml", config)


def is_review(folder: Path) -> bool:
    """Whether ``folder`` holds a config where a review has it."""
    return (folder / "config" / "config.yaml").is_file()


def is_bare_sheet(path: Path) -> bool:
    """Whether ``path`` is a file, or a folder of CSV files, and not a review folder."""
    return path.is_file() or (not is_review(path) and any(path.glob("*.csv")))


def _copy_sheet(path: Path, target: Path) -> None:
    if path.is_file():
        shutil.copyfile(path, target)
        return
    target.mkdir()
    for item in sorted(path.iterdir()):
        if item.is_file() and item.suffix.lower() == ".csv":
            shutil.copyfile(item, target / item.name)


def _write(folder: Path, config: Path, sheet: Path) -> None:
    _prepare(folder)
    shutil.copyfile(config, folder / "config" / "config.yaml")
    shutil.copyfile(sheet, folder / "data" / "extraction.xlsx")


def _prepare(folder: Path) -> None:
    """Make the folder with all that does not depend on config and sheet."""
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise FolderTaken(
            f"{folder} exists and is not empty; name a new folder, nothing was written"
        )
    for name in ("config", "data", "profiles/default"):
        (folder / name).mkdir(parents=True, exist_ok=True)
    write_text(folder / "Snakefile", SNAKEFILE)
    profile = Path("profiles") / "default" / "config.yaml"
    shutil.copyfile(bundled("workflow") / profile, folder / profile)
    write_text(folder / ".gitignore", IGNORED)
