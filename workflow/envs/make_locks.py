"""Write one hashed lock per Python version: `drystone-X.Y.lock` to run, `develop-X.Y.lock` to test.

Needs uv (`python -m pip install uv`). One lock cannot serve all versions, because NumPy and SciPy
drop old Python versions at different times.
"""

import subprocess
import sys
from pathlib import Path

VERSIONS = ("3.11", "3.12", "3.13")
HERE = Path(__file__).resolve().parent
PROJECT = HERE.parents[1] / "pyproject.toml"
KINDS = {"drystone": ["build"], "develop": ["build", "develop"]}


def write_lock(kind: str, version: str) -> Path:
    """Resolve the project for one Python version and write the lock beside this file."""
    target = HERE / f"{kind}-{version}.lock"
    extras = [word for extra in KINDS[kind] for word in ("--extra", extra)]
    command = ["uv", "pip", "compile", str(PROJECT), "--python-version", version, *extras]
    options = ["--universal", "--generate-hashes", "--no-header", "--no-annotate", "--quiet"]
    quiet_index = ["--no-emit-index-url", "--no-emit-find-links"]
    subprocess.run([*command, *options, *quiet_index, "--output-file", str(target)], check=True)
    return target


if __name__ == "__main__":
    for wanted in sys.argv[1:] or VERSIONS:
        for name in KINDS:
            print(write_lock(name, wanted))
