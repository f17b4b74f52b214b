"""The worker: runs the workflow engine in a process of its own and says what happens as JSON lines.

Started by `drystone.driving.front` with the review folder as working directory. It ends at once
when the front process is gone, so that a killed run leaves no writer behind.
"""

from __future__ import annotations

import json
import logging
import os
import signal
import sys
import threading
from pathlib import Path
from typing import Any

_line = threading.Lock()


def tell(event: str, **facts: Any) -> None:
    """Write one event for the front process."""
    text = json.dumps({"event": event, **facts}) + "\n"
    with _line:
        os.write(1, text.encode())


class StepEvents(logging.Handler):
    """Passes the records of `drystone.driving.perform` on as events."""

    def emit(self, record: logging.LogRecord) -> None:
        """Tell the front process which step started, finished or failed."""
        tell(str(record.msg), **getattr(record, "facts", {}))


class EngineErrors(logging.Handler):
    """Keeps what the engine itself complains about, for the case that it stops without a step."""

    def __init__(self) -> None:
        super().__init__(logging.ERROR)
        self.lines: list[str] = []

    def emit(self, record: logging.LogRecord) -> None:
        """Remember the message."""
        self.lines.append(record.getMessage())


def main(words: list[str]) -> int:
    """Run the workflow of the current folder on ``words[0]`` cores; see the module's text."""
    root = Path.cwd().resolve()
    threading.Thread(target=_end_with_front, daemon=True).start()
    from drystone.driving.lock import hold_as_worker
    from drystone.driving.perform import LOGGER, say

    LOGGER.setLevel(logging.INFO)
    LOGGER.addHandler(StepEvents())
    LOGGER.propagate = False
    errors = EngineErrors()
    try:
        hold_as_worker(root)
        os.environ["DRYSTONE_HOLDS"] = str(root)
        _execute(root, int(words[0]), errors)
    except KeyboardInterrupt:
        return 130
    except BaseException as error:  # whatever happens, the front process gets a sentence
        tell("stopped", text=say(error), more=errors.lines[-3:])
        return 1
    return 0


def _execute(root: Path, cores: int, errors: logging.Handler) -> None:
    from snakemake import api
    from snakemake.logging import logger
    from snakemake.scheduling.greedy import SchedulerSettings as GreedySchedulerSettings
    from snakemake.settings import types

    from drystone.driving.bundled import snakefile

    with api.SnakemakeApi(types.OutputSettings(enable_file_logging=False)) as engine:
        for handler in list(logger.handlers):
            logger.removeHandler(handler)
        logger.addHandler(errors)
        workflow = engine.workflow(
            resource_settings=types.ResourceSettings(cores=cores),
            snakefile=snakefile(),
            workdir=root,
        )
        graph = workflow.dag(
            types.DAGSettings(
                rerun_triggers=frozenset({types.RerunTrigger.MTIME}),
                max_checksum_file_size=10**9,
            )
        )
        graph.unlock()  # safe: this process holds the folder, so the engine's lock is a dead run's
        # The engine's marks of incomplete outputs are not asked: a step without a done record has
        # a key that makes it run again, and one with a record is complete.
        graph.execute_workflow(
            executor="local",
            execution_settings=types.ExecutionSettings(
                use_threads=True, keep_going=True, latency_wait=0, ignore_incomplete=True
            ),
            scheduling_settings=types.SchedulingSettings(scheduler="greedy"),
            scheduler_settings=GreedySchedulerSettings(),
        )


def _end_with_front() -> None:
    """Wait for the end of standard input, which the front process holds open, then end all."""
    while os.read(0, 1024):
        pass
    os.killpg(os.getpgid(0), signal.SIGKILL)


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
