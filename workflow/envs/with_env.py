"""Run a command in drystone's own environment, which is made first when it is absent or stale.

    python3 workflow/envs/with_env.py drystone demo
    python3 workflow/envs/with_env.py --develop pytest

Needs nothing but Python 3.11 to 3.13 and its venv module. The environment is installed from the
hashed lock of this Python version into `.venv` (or `.venv-develop`) beside this project.
"""

import hashlib
import os
import subprocess
import sys
import venv
from pathlib import Path

HERE = Path(__file__).resolve().parent
PROJECT = HERE.parents[1]


def main(words: list[str]) -> int:
    """Make the environment when needed, then run ``words`` in it."""
    kind = "develop" if words[:1] == ["--develop"] else "drystone"
    command = words[1:] if kind == "develop" else words
    lock = HERE / f"{kind}-{sys.version_info.major}.{sys.version_info.minor}.lock"
    if not lock.exists():
        found = ", ".join(sorted(p.stem.split("-")[1] for p in HERE.glob(f"{kind}-*.lock")))
        return _stop(f"drystone has no lock for this Python; use one of: {found}")
    if not command:
        return _stop("name the command to run, for example: drystone demo")
    folder = PROJECT / (".venv-develop" if kind == "develop" else ".venv")
    try:
        _make(folder, lock)
    except subprocess.CalledProcessError as error:
        return _stop(f"setting up {folder.name} failed; the lines above say why ({error.returncode})")
    return _run(folder, command)


def _make(folder: Path, lock: Path) -> None:
    """Install lock and project unless the stamp says that this was done."""
    project = (PROJECT / "pyproject.toml").read_bytes()
    wanted = hashlib.sha256(lock.read_bytes() + project + sys.version.encode()).hexdigest()
    stamp = folder / "drystone.stamp"
    if stamp.exists() and stamp.read_text() == wanted:
        return
    print(f"setting up {folder.name} (once; a few minutes on a slow line) ...", file=sys.stderr)
    venv.create(folder, with_pip=True, clear=True)
    pip = [str(folder / "bin" / "python"), "-m", "pip", "install", "--quiet"]
    pip += ["--disable-pip-version-check"]
    subprocess.run([*pip, "--require-hashes", "-r", str(lock)], check=True)
    project_only = ["--no-deps", "--no-build-isolation", "--editable", str(PROJECT)]
    subprocess.run([*pip, *project_only], check=True)
    stamp.write_text(wanted)


def _run(folder: Path, command: list[str]) -> int:
    path = os.pathsep.join([str(folder / "bin"), os.environ.get("PATH", "")])
    environment = {**os.environ, "PATH": path, "VIRTUAL_ENV": str(folder)}
    try:
        return subprocess.run(command, env=environment, check=False).returncode
    except KeyboardInterrupt:
        return 130
    except FileNotFoundError:
        return _stop(f"there is no command '{command[0]}' in {folder.name}")


def _stop(message: str) -> int:
    print(message, file=sys.stderr)
    return 2


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
