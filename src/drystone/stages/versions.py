"""Versions of what the numbers depend on."""

from __future__ import annotations

import platform
from importlib import metadata

from drystone import __version__

LIBRARIES = ("numpy", "scipy", "pandas", "pyarrow", "pandera", "formulaic", "snakemake")


def versions() -> dict[str, str]:
    """Version of drystone, Python and the libraries that the numbers go through."""
    found = {"drystone": __version__, "Python": platform.python_version()}
    return found | {name: metadata.version(name) for name in LIBRARIES}
