"""The front process of ``drystone run``: lock, plan, worker, progress, interruption, last word.

The engine runs in a worker process with a session of its own. Ctrl-C gives it two seconds' grace,
then kills it. Results are replaced only by the last step, so whatever happens the last good ones
stay.
"""

from __future__ import annotations

import contextlib
import json
import os
import shutil
import signal
import subprocess
import sys
import threading
from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from drystone.driving.lock import hold
from drystone.driving.plan import Plan, make_plan

GRACE_SECONDS = 2.0
SPACE_NEEDED = 20_000_000  # bytes; the demo's cache and results take 6 MB
THREAD_VARIABLES = ("OPENBLAS_NUM_THREADS", "OMP_NUM_THREADS", "MKL_NUM_THREADS")

Watcher = Callable[[dict[str, Any]], None]


class NoSpace(OSError):
    """The disk is too full to begin."""


@dataclass
class Outcome:
    """How a run ended.

    Parameters
    ----------
    ran : steps that finished, in order
    failures : a sentence for each step that failed, or for the engine
    interrupted : True after Ctrl-C
    notes : things worth saying, such as results taken back after an interruption
    """

    ran: list[str] = field(default_factory=list)
    failures: list[str] = field(default_factory=list)
    interrupted: bool = False
    notes: list[str] = field(default_factory=list)


def run(root: Path, cores: int, begin: Callable[[Plan], None], watch: Watcher) -> Outcome:
    """Bring the review in ``root`` up to date.

    Parameters
    ----------
    begin : called with the plan before the first step, also when there is nothing to do
    watch : called with every event of the worker

    Raises
    ------
    ConfigProblem, SheetProblem, FolderBusy, OSError
        Before anything was changed.
    """
    root = root.resolve()
    refuse_full_disk(root)
    plan = make_plan(root)  # a wrong config is told before the folder gets a cache
    with hold(root):
        outcome = Outcome(notes=_recover(root))
        begin(plan)
        plan.remember()
        if plan.pending:
            _work(root, cores, outcome, watch)
            _look_back(root, plan, outcome)
    return outcome


def refuse_full_disk(root: Path) -> None:
    """Refuse to begin when the disk is too full to end well.

    Raises
    ------
    NoSpace
        With the free space and the need.
    """
    with contextlib.suppress(FileNotFoundError):
        free = shutil.disk_usage(root).free
        if free < SPACE_NEEDED:
            raise NoSpace(
                f"only {free // 1000} kB are free on the disk of {root.name}; a run needs about "
                f"{SPACE_NEEDED // 1_000_000} MB. Free some and run again; nothing was changed"
            )


def _look_back(root: Path, plan: Plan, outcome: Outcome) -> None:
    """Check that nothing is left to do, and say so when the review changed during the run."""
    after = make_plan(root)
    after.forget()
    if outcome.failures or outcome.interrupted or not after.pending:
        return
    left = len(after.pending)
    if after.keys != plan.keys:
        outcome.notes.append(
            "Sheet, config or code changed while the run was going; the results are of the state "
            f"at its start. Run again for the {left} steps that the change touches."
        )
    else:
        phrases = ", ".join(item.step.phrase for item in list(after.pending.values())[:3])
        outcome.failures.append(f"the run ended, but {left} steps are not up to date: {phrases}")


def _recover(root: Path) -> list[str]:
    from drystone.stages.swap_folders import recover

    if recover(root):
        return ["the last run was interrupted while it replaced results/; the old results are back"]
    return []


def _work(root: Path, cores: int, outcome: Outcome, watch: Watcher) -> None:
    environment = {**os.environ, **dict.fromkeys(THREAD_VARIABLES, "1")}
    errors = root / "cache" / "logs" / "worker.log"
    errors.parent.mkdir(parents=True, exist_ok=True)
    command = [sys.executable, "-m", "drystone.driving.worker", str(cores)]
    with (
        errors.open("wb") as error_file,
        subprocess.Popen(
            command,
            cwd=root,
            env=environment,
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            stderr=error_file,
            start_new_session=True,
        ) as worker,
    ):
        try:
            _listen(worker, outcome, watch)
            code = worker.wait()
        except KeyboardInterrupt:
            outcome.interrupted = True
            _end(worker)
            return
    if code != 0 and not outcome.failures:
        outcome.failures.append(_last_words(code, errors))


def _listen(worker: subprocess.Popen[bytes], outcome: Outcome, watch: Watcher) -> None:
    assert worker.stdout is not None
    for line in worker.stdout:
        try:
            event = json.loads(line)
        except ValueError:
            continue  # something printed by a library; not an event
        if event["event"] == "finished":
            outcome.ran.append(event["step"])
        elif event["event"] == "failed" or (event["event"] == "stopped" and not outcome.failures):
            outcome.failures.append(event["text"])
        watch(event)


def _end(worker: subprocess.Popen[bytes]) -> None:
    """Two seconds' grace, then kill; a second Ctrl-C does not cut this short."""
    handler = None
    if threading.current_thread() is threading.main_thread():
        handler = signal.signal(signal.SIGINT, signal.SIG_IGN)
    try:
        with contextlib.suppress(ProcessLookupError):
            os.killpg(worker.pid, signal.SIGINT)
        try:
            worker.wait(GRACE_SECONDS)
        except subprocess.TimeoutExpired:
            with contextlib.suppress(ProcessLookupError):
                os.killpg(worker.pid, signal.SIGKILL)
            worker.wait()
    finally:
        if handler is not None:
            signal.signal(signal.SIGINT, handler)


def _last_words(code: int, errors: Path) -> str:
    text = errors.read_text("utf-8", "replace").strip() if errors.exists() else ""
    last = text.splitlines()[-1] if text else "it said nothing"
    if code < 0:
        return f"the worker was ended from outside (signal {-code}); run again to go on"
    return f"the worker stopped: {last} (log: cache/logs/worker.log)"
