"""Files that travel with the package: the workflow and the templates."""

from __future__ import annotations

from pathlib import Path

PACKAGE = Path(__file__).resolve().parents[1]


def bundled(name: str) -> Path:
    """Folder ``workflow`` or ``data_template``: inside the wheel, or in the clone beside src.

    Raises
    ------
    LookupError
        When the installation is incomplete.
    """
    for base in (PACKAGE / "_bundled", PACKAGE.parents[1]):
        if (base / name).is_dir():
            return base / name
    raise LookupError(f"the installation lacks its folder '{name}'; install drystone again")


def snakefile() -> Path:
    """Entry file of the workflow."""
    return bundled("workflow") / "Snakefile"
