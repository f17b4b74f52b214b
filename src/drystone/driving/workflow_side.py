"""What the Snakefile calls: opens the review, writes the keys, names files, performs jobs."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from snakemake.exceptions import WorkflowError

from drystone.driving.lock import FolderBusy, hold_for_process
from drystone.driving.perform import StepFailed
from drystone.driving.perform import perform as perform_step
from drystone.driving.plan import Plan, make_plan
from drystone.settings.problems import ConfigProblem
from drystone.sheet.problems import SheetProblem

HELD = "DRYSTONE_HOLDS"  # set in the environment of processes whose parent holds the folder


def begin(root: Path, config: dict[str, Any]) -> Plan:
    """Plan of the review in ``root``; keys are written, so the engine can decide what runs.

    Parameters
    ----------
    config : settings as a mapping when the workflow is used as a module, else empty

    Raises
    ------
    WorkflowError
        With the sentence of the problem in config or sheet, or when another run holds the folder.
    """
    root = root.resolve()
    try:
        if os.environ.get(HELD) != str(root):
            hold_for_process(root)
            os.environ[HELD] = str(root)
        plan = make_plan(root, config or None)
        plan.write_keys()
    except (ConfigProblem, FolderBusy, SheetProblem, OSError) as problem:
        raise WorkflowError(str(problem)) from None
    return plan


def targets(plan: Plan) -> list[str]:
    """Every file of the workflow, so that a lost one is made again."""
    return [path for step in plan.steps.values() for path in step.outputs]


def upstream(plan: Plan, name: str) -> list[str]:
    """Outputs of all steps above the step ``name``."""
    return [path for above in plan.steps[name].upstream for path in plan.steps[above].outputs]


def sheet_files(plan: Plan) -> list[str]:
    """Files of the extraction sheet."""
    return [str(path) for path in plan.review.sheet_files()]


def perform(plan: Plan, name: str) -> None:
    """Run one step; see `drystone.driving.perform.perform`.

    Raises
    ------
    WorkflowError
        With the sentence that a person reads.
    """
    try:
        perform_step(plan, name)
    except StepFailed as failure:
        raise WorkflowError(str(failure)) from None
