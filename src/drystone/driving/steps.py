"""The steps of a review: names, files, and what each depends on. Nothing is read here."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any

from drystone.settings.model import Analysis, Settings, Strategy

ANALYSES = "cache/analyses"
MARKED = "cache/check/marked.xlsx"


@dataclass(frozen=True)
class Step:
    """One job of the workflow.

    Parameters
    ----------
    name : path-like and unique, such as ``fit/yield/all cases/overall``
    rule : workflow rule
    phrase : the step in words, for messages
    outputs : files that the step writes, relative to the review folder
    upstream : names of steps whose outputs it reads
    settings : the options that decide its result
    modules : its stage module, and modules that it loads by name
    rows : which digest of the sheet it depends on: 'check', 'facts', 'figures', 'slice' or ''
    """

    name: str
    rule: str
    phrase: str
    outputs: tuple[str, ...]
    upstream: tuple[str, ...] = ()
    settings: dict[str, Any] = field(default_factory=dict)
    modules: tuple[str, ...] = ()
    rows: str = ""
    analysis: str = ""

    @property
    def key(self) -> str:
        """File that decides whether the step reruns."""
        return f"cache/keys/{self.name}.json"

    @property
    def done(self) -> str:
        """Record of the key that the present outputs were made from."""
        return f"cache/done/{self.name}.json"


def all_steps(settings: Settings) -> dict[str, Step]:
    """Every step of the review in running order, by name."""
    return {step.name: step for step in _steps(settings)}


def _steps(settings: Settings) -> Iterator[Step]:
    yield Step(
        "check",
        "check_sheet",
        "check of the sheet",
        _files("cache/check", "findings", "accepted", "ledger", "derivations", "studies"),
        modules=("drystone.stages.check_sheet",),
        rows="check",
    )
    yield Step(
        "mark",
        "mark_sheet",
        "marked copy of the sheet",
        (MARKED,),
        modules=("drystone.stages.mark_sheet",),
        rows="check",
    )
    made: list[str] = []
    drawn: list[str] = []
    for name, analysis in settings.all_analyses().items():
        for step in _analysis_steps(name, analysis, settings):
            made.append(step.name)
            yield step
        figures = _figures_step(name, settings, tuple(s for s in made if s.split("/")[1] == name))
        drawn.append(figures.name)
        yield figures
    yield Step(
        "report",
        "render_report",
        "report",
        ("cache/report/report.html",),
        upstream=tuple(made),
        settings=settings.model_dump(),
        modules=("drystone.stages.render_report",),
        rows="facts",
    )
    yield Step(
        "publish",
        "publish_results",
        "results folder",
        ("cache/published.json",),
        upstream=("check", "mark", "report", *drawn),
        modules=("drystone.stages.publish_results",),
    )


def _analysis_steps(name: str, analysis: Analysis, settings: Settings) -> Iterator[Step]:
    folder = f"{ANALYSES}/{name}"
    flips = {outcome: settings.outcomes[outcome].flip_sign for outcome in analysis.outcome}
    yield Step(
        f"slice/{name}",
        "slice_rows",
        f"rows of {name}",
        _files(folder, "slice", "ledger", "derivations"),
        settings={
            "analysis": analysis.model_dump(include={"outcome", "where", "where_not", "models"}),
            "flip_sign": flips,
        },
        modules=("drystone.stages.slice_rows",),
        rows="slice",
        analysis=name,
    )
    yield Step(
        f"effects/{name}",
        "compute_effects",
        f"effects of {name}",
        _files(folder, "effects"),
        upstream=(f"slice/{name}",),
        modules=("drystone.stages.compute_effects",),
        analysis=name,
    )
    fits: list[str] = []
    strategies = settings.all_strategies()
    for strategy in strategies.values():
        yield _sampling_step(name, analysis, strategy)
        for model, formula in analysis.models.items():
            step = _fit_step(name, analysis, strategy, model, formula, settings)
            fits.append(step.name)
            yield step
    yield Step(
        f"compare/{name}",
        "compare_strategies",
        f"strategies of {name} side by side",
        _files(folder, "side_by_side"),
        upstream=tuple(fits),
        settings={
            "primary": settings.primary,
            "row sets": {key: [item.use, item.rows] for key, item in strategies.items()},
        },
        modules=("drystone.stages.compare_strategies",),
        analysis=name,
    )


def _figures_step(name: str, settings: Settings, above: tuple[str, ...]) -> Step:
    shown = settings.model_dump(include={"outcomes", "primary", "inference"})
    return Step(
        f"figures/{name}",
        "draw_figures",
        f"figures of {name}",
        (f"cache/figures/{name}/list.json",),
        upstream=above,
        settings=shown,
        modules=("drystone.stages.draw_figures",),
        rows="figures",
        analysis=name,
    )


def _sampling_step(name: str, analysis: Analysis, strategy: Strategy) -> Step:
    return Step(
        f"sampling/{name}/{strategy.name}",
        "fill_spreads",
        f"spreads of {name} / {strategy.name}",
        _files(
            f"{ANALYSES}/{name}/{strategy.name}", "sampling", "covariance", "averages", "ledger"
        ),
        upstream=(f"slice/{name}",),
        settings={
            "analysis": analysis.model_dump(include={"effect", "order", "shared_controls"}),
            "strategy": strategy.model_dump(),
        },
        modules=("drystone.stages.fill_spreads", strategy_module(strategy.use)),
        analysis=name,
    )


def _fit_step(
    name: str,
    analysis: Analysis,
    strategy: Strategy,
    model: str,
    formula: str,
    settings: Settings,
) -> Step:
    return Step(
        f"fit/{name}/{strategy.name}/{model}",
        "fit_model",
        f"fit of {name} / {strategy.name} / {model}",
        _files(
            f"{ANALYSES}/{name}/{strategy.name}/{model}",
            "coefficients",
            "components",
            "heterogeneity",
            "ledger",
        ),
        upstream=(f"slice/{name}", f"sampling/{name}/{strategy.name}"),
        settings={
            "formula": formula,
            "levels": list(analysis.levels),
            "inference": settings.inference.model_dump(),
        },
        modules=("drystone.stages.fit_model",),
        analysis=name,
    )


def strategy_module(use: str) -> str:
    """Module of a strategy, so that a step depends on the code of its own strategy only."""
    from drystone.stages.strategies import REGISTRY

    return REGISTRY[use]


def _files(folder: str, *names: str) -> tuple[str, ...]:
    return tuple(f"{folder}/{name}.parquet" for name in names)
