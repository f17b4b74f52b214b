"""What ``drystone run`` shows: one progress display, then what ran, what left, and the report."""

from __future__ import annotations

import shutil
import signal
import sys
import threading
from pathlib import Path
from typing import TYPE_CHECKING, Any

from drystone.driving import exits
from drystone.driving.filters import idle_filters
from drystone.driving.front import Outcome, run
from drystone.driving.plan import Plan

if TYPE_CHECKING:
    from rich.progress import Progress


class StrictStop(Exception):
    """Rows have findings of level stop and the team asked not to run then."""


class Display:
    """Progress on a terminal, plain lines elsewhere."""

    def __init__(self) -> None:
        self._bar: Progress | None = None
        self._task: Any = None

    def open(self) -> None:
        """Show that something happens: reading a large sheet takes seconds."""
        if not sys.stderr.isatty():
            return
        from rich.console import Console
        from rich.progress import BarColumn, MofNCompleteColumn, Progress, TextColumn

        columns = (BarColumn(), MofNCompleteColumn(), TextColumn("{task.description}"))
        self._bar = Progress(*columns, console=Console(stderr=True), transient=True)
        self._task = self._bar.add_task("reading config and sheet", total=None)
        self._bar.start()

    def begin(self, plan: Plan) -> None:
        """Show how much there is to do."""
        if self._bar is not None:
            total = len(plan.pending)
            self._bar.update(self._task, total=total, description="starting the steps")

    def watch(self, event: dict[str, Any]) -> None:
        """Show one event of the worker."""
        if self._bar is None:
            return
        if event["event"] == "started":
            self._bar.update(self._task, description=event["phrase"])
        elif event["event"] == "finished":
            self._bar.advance(self._task)

    def end(self) -> None:
        """Take the progress display away."""
        if self._bar is not None:
            self._bar.stop()
            self._bar = None


def run_review(folder: Path, cores: int, strict: bool = False, tidy: bool = False) -> int:
    """Run the review in ``folder`` and say how it went; returns the exit code."""
    display = Display()
    seen: list[Plan] = []

    def begin(plan: Plan) -> None:
        seen.append(plan)
        if strict and _has_stops(plan):
            raise StrictStop
        display.begin(plan)

    _end_calmly_on_signals()
    try:
        display.open()
        outcome = run(folder, cores, begin, display.watch)
    except StrictStop:
        _say_stops(seen[0])
        _say("Nothing was run, because of --strict. `drystone check` lists the findings.")
        return exits.STOPS
    finally:
        display.end()
    return _last_word(seen[0], outcome, tidy)


def _end_calmly_on_signals() -> None:
    """Treat a request to end, or a closed terminal, as Ctrl-C."""
    if threading.current_thread() is threading.main_thread():
        for number in (signal.SIGTERM, signal.SIGHUP):
            signal.signal(number, signal.default_int_handler)


def _last_word(plan: Plan, outcome: Outcome, tidy: bool) -> int:
    for note in outcome.notes:
        _say(note)
    if outcome.interrupted:
        _say("Interrupted. The last good results stay; the next run goes on from here.")
        return exits.INTERRUPTED
    if outcome.failures:
        for failure in outcome.failures:
            _say(f"drystone: {failure}")
        _say(
            "The last good results stay as they were." if _has_results(plan) else "No results yet."
        )
        return exits.FAILED
    _say_ran(plan, outcome)
    _say_stops(plan)
    for note in idle_filters(plan):
        _say(note)
    _say_leftovers(plan, tidy)
    plan.state.remember()
    print(shown_path(plan.review.results / "report.html"))  # noqa: T201 - the one line for scripts
    return exits.DONE


def _say_ran(plan: Plan, outcome: Outcome) -> None:
    total = len(plan.steps)
    if not outcome.ran:
        _say(f"Nothing to do: all {total} steps are up to date.")
        return
    others = "" if len(outcome.ran) == total else "; the others were up to date"
    _say(f"{len(outcome.ran)} of {total} steps ran{others}.")


def _say_stops(plan: Plan) -> None:
    rows, by_rule = plan.state.rows_left()
    if by_rule:
        _say(f"{sum(by_rule.values())} of {rows} rows cannot be used and stand in the ledger:")
        for rule, count in by_rule.items():
            _say(f"  {count} x {rule}")


def _say_leftovers(plan: Plan, tidy: bool) -> None:
    unused = plan.leftovers()
    for path in unused:
        if tidy:
            shutil.rmtree(plan.review.root / path, ignore_errors=True)
            _say(f"Removed {path}, which the config no longer has.")
        else:
            _say(f"{path} belongs to nothing in the config; `drystone run --tidy` removes it.")


def _has_stops(plan: Plan) -> bool:
    from drystone.words.levels import STOP

    return bool((plan.state.table("findings")["level"] == STOP).any())


def _has_results(plan: Plan) -> bool:
    return (plan.review.results / "manifest.json").exists()


def shown_path(path: Path) -> Path:
    """Path as a person types it from here."""
    here = Path.cwd()
    return path.relative_to(here) if path.is_relative_to(here) else path


def _say(text: str) -> None:
    print(text, file=sys.stderr)  # noqa: T201 - the command's talk goes to standard error
