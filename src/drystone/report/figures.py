"""Figures for a paper: one Vega-Lite specification each, saved as SVG, PDF and PNG.

They are drawn from the same views as the page, so picture and page tell one story. The page itself
draws its bars as plain SVG in the text: measured, the chart library needs 1.3 s for the first
picture and scales its letters with the window, while plain SVG needs no time and stays legible.
Names of studies are data only, never part of an expression.
"""

from __future__ import annotations

import math
from pathlib import Path

from drystone.report import charts, numbers
from drystone.report.facts import AnalysisFacts, ReportFacts, main_model, main_strategy
from drystone.report.gaps import gap_studies
from drystone.report.ladder import Ladder, LadderRow, LadderStudy, build_ladder
from drystone.report.links import Links
from drystone.report.scale import ratio_scale
from drystone.report.spread import arm_table
from drystone.settings.model import folder_name

Spec = charts.Spec
MOST_ROWS = 60  # above it the figure of rows is left out: it could not be read on a printed page
ENDS = ("estimate", "ci_low", "ci_high", "pi_low", "pi_high")
STATES = {"own": "own SD", "other row": "SD from another row", "none": "no SD"}


def figure_specs(facts: ReportFacts) -> dict[str, Spec]:
    """Vega-Lite specifications by file name without ending."""
    specs: dict[str, Spec] = {}
    for analysis in facts.analyses:
        name = folder_name(analysis.name)
        ladder = _ladder(facts, analysis)
        specs[f"{name} strategies"] = _strategies(facts, analysis)
        specs[f"{name} studies"] = _studies(ladder)
        if sum(len(study.rows) for study in ladder.studies) <= MOST_ROWS:
            specs[f"{name} rows"] = _rows(ladder)
        specs[f"{name} gaps"] = _gaps(facts, analysis)
        for position, (outcome, spec) in enumerate(_spread(analysis), start=1):
            specs[f"{name} spread {position} {folder_name(outcome)}"] = spec
    return specs


def save_figures(facts: ReportFacts, folder: Path) -> tuple[Path, ...]:
    """Write every figure to ``folder`` as SVG, PDF and PNG; return the files.

    Raises
    ------
    OSError
        When the folder cannot be written.
    """
    folder.mkdir(parents=True, exist_ok=True)
    written: list[Path] = []
    for name, spec in figure_specs(facts).items():
        for ending, content in _pictures(spec).items():
            path = folder / f"{name}.{ending}"
            path.write_bytes(content)
            written.append(path)
    return tuple(written)


def _pictures(spec: Spec) -> dict[str, bytes]:
    """The figure in each format; PDF and PNG are made from the SVG, which halves the time."""
    import vl_convert  # slow to start, and not needed for the page

    # no address is allowed, so a specification can never fetch anything
    svg = vl_convert.vegalite_to_svg(spec, allowed_base_urls=[])
    pdf = vl_convert.svg_to_pdf(svg)
    return {
        "svg": svg.encode(),
        "pdf": pdf,
        "png": vl_convert.svg_to_png(svg, scale=2),
    }


def _ladder(facts: ReportFacts, analysis: AnalysisFacts) -> Ladder:
    strategy = main_strategy(facts, analysis)
    return build_ladder(facts, analysis, strategy, main_model(strategy), Links({}, {}))


def _strategies(facts: ReportFacts, analysis: AnalysisFacts) -> Spec:
    values: list[Spec] = []
    for strategy in analysis.strategies:
        model = main_model(strategy)
        overall = model.overall() if model is not None else None
        if overall is not None:
            ends = {name: _json(overall[name]) for name in ENDS}
            rows = numbers.count(int(overall["rows"]), "row")
            values.append({"label": f"{strategy.name}, {rows}", "beyond": "", **ends})
    scale = ratio_scale([], [end for value in values for name in ENDS if (end := value[name])])
    level = numbers.level_percent(facts.settings.inference.confidence_percent)
    title = f"Overall change by strategy: {level} interval (dark), prediction interval (pale)"
    return charts.intervals(values, title, 30, scale, [])


def _studies(ladder: Ladder) -> Spec:
    values = [_line(f"{study.name} ({len(study.rows)})", study, ladder) for study in ladder.studies]
    title = (
        f"Change in each study (rows); {_reach(ladder)}; band: overall interval; "
        "outlined: most rows lack an SD"
    )
    return charts.intervals(values, title, 14, ladder.scale, _band(ladder))


def _rows(ladder: Ladder) -> Spec:
    values = [
        _line(f"{study.name}, {row.row_id}", row, ladder)
        for study in ladder.studies
        for row in study.rows
    ]
    title = (
        f"Change in each row; {_reach(ladder)}; band: overall interval; "
        "outlined: an arm lacks an SD"
    )
    return charts.intervals(values, title, 14, ladder.scale, _band(ladder))


def _reach(ladder: Ladder) -> str:
    return f"bar: {numbers.number(ladder.times)} SE"


def _line(label: str, item: LadderStudy | LadderRow, ladder: Ladder) -> Spec:
    return {
        "label": label,
        "estimate": _json(item.effect),
        "ci_low": _json(item.low),
        "ci_high": _json(item.high),
        "hollow": item.gappy,
        "beyond": _beyond(item.effect, ladder),
    }


def _beyond(effect: float, ladder: Ladder) -> str:
    if math.isnan(effect):
        return numbers.NOT_KNOWN
    inside = ladder.scale.low <= effect <= ladder.scale.high
    return "" if inside else f"{numbers.percent(effect)}, off the scale"


def _band(ladder: Ladder) -> list[Spec]:
    if ladder.interval is None:
        return []
    return [{"ci_low": ladder.interval[0], "ci_high": ladder.interval[1]}]


def _gaps(facts: ReportFacts, analysis: AnalysisFacts) -> Spec:
    values = [
        {"study": study.name, "order": order, "place": place, "arm": arm, "state": STATES[state]}
        for order, study in enumerate(gap_studies(analysis.slice, facts.studies, {}))
        for place, cell in enumerate(study.cells, start=1)
        for arm, state in (("control", cell.control), ("treatment", cell.treatment))
    ]
    return charts.gap_marks(values, list(STATES.values()))


def _spread(analysis: AnalysisFacts) -> list[tuple[str, Spec]]:
    table = arm_table(analysis.slice)
    known = table[(table["sd"] > 0) & (table["mean"] > 0)]
    found = []
    for outcome, part in known.groupby("outcome", sort=False):
        values = [
            {"mean": float(m), "sd": float(s), "arm": str(a), "study": str(t)}
            for m, s, a, t in zip(
                part["mean"], part["sd"], part["side"], part["study"], strict=True
            )
        ]
        found.append((str(outcome), charts.mean_and_spread(str(outcome), values)))
    return found


def _json(value: float) -> float | None:
    return None if value != value else float(value)
