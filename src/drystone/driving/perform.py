"""One job: dispatches to the stage, keeps the done record, turns every failure into a sentence.

Stages run as threads of the engine's process. A SystemExit in such a thread would hang the engine
for good, so everything becomes an ordinary error here.
"""

from __future__ import annotations

import errno
import logging
import traceback
from collections.abc import Callable
from pathlib import Path

from drystone.driving.files import write_json
from drystone.driving.plan import Plan
from drystone.driving.steps import ANALYSES, Step
from drystone.tables.atomic import write_text

Stage = Callable[[Plan, Step], None]
LOGGER = logging.getLogger("drystone.steps")


class StepFailed(RuntimeError):
    """A step that did not finish; the message is the sentence that a person reads."""


def perform(plan: Plan, name: str) -> None:
    """Run the step ``name``; its done record is removed before and written after.

    Raises
    ------
    StepFailed
        With what went wrong and where the log is.
    """
    step = plan.steps[name]
    log = plan.review.root / log_path(step)
    LOGGER.info("started", extra={"facts": {"step": name, "phrase": step.phrase}})
    try:
        (plan.review.root / step.done).unlink(missing_ok=True)
        STAGES[step.rule](plan, step)
        record = {**plan.keys[name], "state": plan.state.name}
        write_json(plan.review.root / step.done, record)
        log.unlink(missing_ok=True)
    except BaseException as error:  # also SystemExit and KeyboardInterrupt, see the module's text
        sentence = _note(step, log, error)
        LOGGER.error("failed", extra={"facts": {"step": name, "text": sentence}})
        raise StepFailed(sentence) from None
    LOGGER.info("finished", extra={"facts": {"step": name}})


def log_path(step: Step) -> str:
    """Where a failed step leaves its traceback."""
    return f"cache/logs/{step.name}.log"


def _note(step: Step, log: Path, error: BaseException) -> str:
    sentence = say(error)
    try:
        write_text(log, f"{step.name}\n{sentence}\n\n{traceback.format_exc()}")
    except OSError:
        return f"{step.phrase}: {sentence}"
    return f"{step.phrase}: {sentence} (log: {log_path(step)})"


def say(error: BaseException) -> str:
    """Sentence for an error, without a traceback."""
    if isinstance(error, OSError) and error.errno == errno.ENOSPC:
        return "no space is left on the disk; free some and run again"
    if isinstance(error, OSError) and error.errno in (errno.EROFS, errno.EACCES, errno.EPERM):
        return f"cannot write {error.filename or 'a file'}; the folder is read-only"
    if isinstance(error, FileExistsError | NotADirectoryError | IsADirectoryError):
        return f"{error.filename} is in the way of a file or folder of drystone's; move it away"
    if isinstance(error, MemoryError):
        return "the memory is full"
    text = str(error).strip()
    return text.splitlines()[-1] if text else type(error).__name__


def _check(plan: Plan, step: Step) -> None:
    from drystone.stages.check_sheet import run

    plan.state.ensure()
    run(plan.state.folder, plan.review.cache / "check")


def _slice(plan: Plan, step: Step) -> None:
    from drystone.stages.slice_rows import run

    plan.state.ensure()
    settings = plan.review.settings
    analysis = settings.all_analyses()[step.analysis]
    run(plan.state.folder, analysis, settings.outcomes, _folder(plan, step))


def _effects(plan: Plan, step: Step) -> None:
    from drystone.stages.compute_effects import run

    run(_folder(plan, step) / "slice.parquet", plan.review.root / step.outputs[0])


def _sampling(plan: Plan, step: Step) -> None:
    from drystone.stages.fill_spreads import run

    settings = plan.review.settings
    strategy = settings.all_strategies()[step.name.split("/")[2]]
    analysis = settings.all_analyses()[step.analysis]
    target = _folder(plan, step) / strategy.name
    run(_folder(plan, step) / "slice.parquet", analysis, strategy, target)


def _fit(plan: Plan, step: Step) -> None:
    from drystone.stages.fit_model import run

    settings = plan.review.settings
    _, name, strategy, model = step.name.split("/")
    analysis, folder = settings.all_analyses()[name], _folder(plan, step)
    run(
        folder / "slice.parquet",
        folder / strategy,
        analysis.models[model],
        analysis,
        settings.inference,
        folder / strategy / model,
    )


def _compare(plan: Plan, step: Step) -> None:
    from drystone.stages.compare_strategies import run

    settings = plan.review.settings
    folder = _folder(plan, step)
    fits = {}
    for name in step.upstream:
        _, _, strategy, model = name.split("/")
        fits[strategy, model] = folder / strategy / model / "coefficients.parquet"
    target = plan.review.root / step.outputs[0]
    run(fits, settings.all_strategies(), settings.primary, target)


def _figures(plan: Plan, step: Step) -> None:
    from drystone.stages.draw_figures import run

    plan.state.ensure()
    target = plan.review.root / step.outputs[0]
    run(plan.review.root, plan.review.settings, plan.state.folder, step.analysis, target)


def _report(plan: Plan, step: Step) -> None:
    from drystone.stages.render_report import run

    plan.state.ensure()
    run(plan.review.root, plan.review.settings, plan.state.folder, run_id(plan))


def _publish(plan: Plan, step: Step) -> None:
    from drystone.stages.publish_results import run

    _refuse_mixed(plan)
    root, settings = plan.review.root, plan.review.settings
    run(root, settings, plan.state.folder, run_id(plan), plan.inputs)


def run_id(plan: Plan) -> str:
    """Name of this state of data, options and code: equal inputs, equal name."""
    return str(plan.keys["report"]["digest"])[:12]


def _refuse_mixed(plan: Plan) -> None:
    """Refuse to publish results that come from different states of sheet or config."""
    for name, step in plan.steps.items():
        record = plan.record(step)
        if name != "publish" and (record is None or record["digest"] != plan.keys[name]["digest"]):
            raise StepFailed(
                f"sheet, config or code changed while the run was going ({step.phrase}); run again"
            )


def _folder(plan: Plan, step: Step) -> Path:
    return plan.review.root / ANALYSES / step.analysis


STAGES: dict[str, Stage] = {
    "check_sheet": _check,
    "slice_rows": _slice,
    "compute_effects": _effects,
    "fill_spreads": _sampling,
    "fit_model": _fit,
    "compare_strategies": _compare,
    "draw_figures": _figures,
    "render_report": _report,
    "publish_results": _publish,
}
