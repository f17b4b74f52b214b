"""A review folder: where its config, its sheet, its cache and its results are."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Any

from drystone.settings.load import load_settings, settings_from
from drystone.settings.model import Settings
from drystone.settings.problems import ConfigProblem

CONFIG = Path("config") / "config.yaml"
SHEETS = {".xlsx", ".xlsm", ".ods", ".csv"}


@dataclass(frozen=True)
class Review:
    """An opened review folder."""

    root: Path
    settings: Settings

    @property
    def cache(self) -> Path:
        """Folder of the stages."""
        return self.root / "cache"

    @property
    def answers(self) -> Path:
        """What people decided about findings; may be absent."""
        return self.root / "answers.csv"

    @property
    def bound_answers(self) -> Path:
        """Digests of the rows that lines without one were about when they were first read."""
        return self.cache / "answers.json"

    @property
    def results(self) -> Path:
        """Folder that people read."""
        return self.root / "results"

    def sheet_path(self) -> Path:
        """Where the sheet is: a workbook, a CSV file, or a folder of CSV files.

        Raises
        ------
        ConfigProblem
            When it does not exist or is of another kind.
        """
        path = self.root / self.settings.sheet
        if path.is_dir() or (path.is_file() and path.suffix.lower() in SHEETS):
            return path
        raise ConfigProblem(_sheet_message(path), str(CONFIG))

    def sheet_files(self) -> list[Path]:
        """Files whose content is the sheet, in a fixed order, relative to the root."""
        path = self.sheet_path()
        if path.is_file():
            return [path.relative_to(self.root)] if path.is_relative_to(self.root) else [path]
        named = self.settings.layout.sheet or "comparisons.csv"
        files = [path / name for name in dict.fromkeys((named, "studies.csv"))]
        return [
            file.relative_to(self.root) if file.is_relative_to(self.root) else file
            for file in files
            if file.is_file()
        ]


def open_review(root: Path, content: dict[str, Any] | None = None) -> Review:
    """Open the review folder ``root``.

    Parameters
    ----------
    content : config as a mapping, instead of the file (use as a workflow module)

    Raises
    ------
    ConfigProblem
        When the config is absent or wrong, or its sheet is absent.
    """
    if content is not None:
        return Review(root, settings_from(content))
    if not root.is_dir():
        raise ConfigProblem("there is no such folder", str(root))
    return Review(root, load_settings_relative(root))


def load_settings_relative(root: Path) -> Settings:
    """Load the config of ``root``; messages name it relative to the review folder."""
    try:
        return load_settings(root / CONFIG)
    except ConfigProblem as problem:
        raise ConfigProblem(str(problem).replace(f"{root}/", "")) from problem


def _sheet_message(path: Path) -> str:
    if not path.exists():
        beside = sorted(
            p.name for p in path.parent.glob("*") if p.suffix.lower() in SHEETS or p.is_dir()
        )
        hint = f"; beside it there is {', '.join(beside[:5])}" if beside else ""
        return f"sheet: '{path.name}' does not exist in {path.parent.name}{hint}"
    return (
        f"sheet: '{path.name}' is not a sheet that can be read; name an .xlsx or .ods workbook, a "
        ".csv file, or a folder with comparisons.csv"
    )
