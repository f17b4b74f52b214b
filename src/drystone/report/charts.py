"""Vega-Lite specifications of the figures, from plain values; no state outside the dictionaries."""

from __future__ import annotations

from typing import Any

from drystone.report.scale import RatioScale

Spec = dict[str, Any]
INK, QUIET, DEEP, PALE, OCHRE = "#1d2733", "#55606e", "#24557f", "#a9c4da", "#a8560c"
BAND = "#d5e3ee"
WIDTH = 420
BARE: Spec = {"title": None, "domain": False, "ticks": False}
SCHEMA = "https://vega.github.io/schema/vega-lite/v5.json"  # a name, never fetched
PERCENT_AXIS = "abs(datum.value) < 1e-9 ? '0' : format(100 * (exp(datum.value) - 1), '+.0f')"
CONFIG: Spec = {
    "background": "white",
    "font": "Liberation Sans, Arial, sans-serif",
    "view": {"stroke": None},
    "axis": {"labelColor": INK, "titleColor": QUIET, "titleFontWeight": "normal",
             "gridColor": "#eceae4", "domainColor": QUIET, "tickColor": QUIET, "labelLimit": 320},
    "legend": {"labelColor": INK, "titleColor": QUIET, "titleFontWeight": "normal"},
    "title": {"color": INK, "anchor": "start", "fontWeight": "normal", "fontSize": 13},
}  # fmt: skip


def intervals(
    values: list[Spec], title: str, step: int, scale: RatioScale, band: list[Spec]
) -> Spec:
    """Bars with a tick, one line for each value, on a log scale read as percent change.

    Parameters
    ----------
    values : label, estimate, ci_low, ci_high, beyond (text of an estimate off the scale, or
        blank), and where known hollow, pi_low, pi_high
    band : at most one record with ci_low and ci_high, drawn behind all lines
    """
    numbered = [value | {"position": position} for position, value in enumerate(values)]
    line = {"field": "label", "type": "nominal", "sort": {"field": "position"}, "axis": BARE}
    height = max(4, step // 3)
    place = _ratio("ci_low", scale)
    layers = [
        {
            "data": {"values": band},
            "mark": {"type": "rect", "color": BAND},
            "encoding": {"x": place, "x2": {"field": "ci_high"}},
        },
        {"mark": {"type": "rule", "color": QUIET}, "encoding": {"x": {"datum": 0}}},
        *_predicted(numbered, line, scale),
        _bars(place, line, height),
        _estimates(line, height, scale),
        _off_the_scale(line),
    ]
    return spec(title, numbered, {"width": WIDTH, "height": {"step": step}, "layer": layers})


def _ratio(field: str, scale: RatioScale) -> Spec:
    values = [tick.value for tick in scale.ticks()]
    axis = {"title": "Percent change, median ratio", "labelExpr": PERCENT_AXIS, "values": values}
    domain = {"zero": False, "nice": False, "domain": [scale.low, scale.high]}
    return {"field": field, "type": "quantitative", "scale": domain, "axis": axis}


def _predicted(values: list[Spec], line: Spec, scale: RatioScale) -> list[Spec]:
    if not any(value.get("pi_low") is not None for value in values):
        return []
    ends = {"x": _ratio("pi_low", scale), "x2": {"field": "pi_high"}, "y": line}
    return [{"mark": {"type": "bar", "height": 2, "color": PALE, "clip": True}, "encoding": ends}]


def _bars(place: Spec, line: Spec, height: int) -> Spec:
    mark = {"type": "bar", "height": height, "clip": True, "strokeWidth": 1.2, "stroke": DEEP}
    fill = {"condition": {"test": "datum.hollow", "value": "white"}, "value": DEEP}
    ends = {"x": place, "x2": {"field": "ci_high"}, "y": line}
    return {"mark": mark, "encoding": ends | {"fill": fill}}


def _estimates(line: Spec, height: int, scale: RatioScale) -> Spec:
    mark = {"type": "tick", "thickness": 2, "size": height + 6, "clip": True, "opacity": 1}
    return {
        "mark": mark | {"color": INK},
        "encoding": {"x": _ratio("estimate", scale), "y": line},
    }


def _off_the_scale(line: Spec) -> Spec:
    mark = {"type": "text", "align": "left", "dx": 6, "color": INK}
    return {
        "mark": mark,
        "encoding": {"x": {"value": WIDTH}, "y": line, "text": {"field": "beyond"}},
    }


def gap_marks(values: list[Spec], states: list[str]) -> Spec:
    """Two half marks for each comparison, one line for each study."""
    color = {
        "field": "state",
        "type": "nominal",
        "title": None,
        "scale": {"domain": states, "range": [DEEP, PALE, "#ffffff"]},
        "legend": {"orient": "top", "symbolStrokeColor": OCHRE},
    }
    places = {"title": "Comparison in the study", "labelAngle": 0, "labelOverlap": True}
    encoding = {
        "x": {"field": "place", "type": "ordinal", "axis": places},
        "y": {"field": "study", "type": "nominal", "sort": {"field": "order"}, "axis": BARE},
        "yOffset": {"field": "arm", "type": "nominal", "sort": ["control", "treatment"]},
        "fill": color,
    }
    mark = {"type": "rect", "stroke": OCHRE, "strokeWidth": 0.5}
    body = {"width": {"step": 12}, "height": {"step": 8}, "mark": mark, "encoding": encoding}
    title = "Arms without SD, oldest study first; upper half control, lower half treatment"
    return spec(title, values, body)


def mean_and_spread(outcome: str, values: list[Spec]) -> Spec:
    """Log SD on log mean with lines of equal CV."""
    low, high = (pick(value["mean"] for value in values) for pick in (min, max))
    lines = [
        {"mean": end, "sd": end * cv, "cv": f"CV {cv:g}"}
        for cv in (0.1, 0.3, 1.0)
        for end in (low, high)
    ]
    axis = {"type": "quantitative", "scale": {"type": "log", "nice": False}}
    place = {
        "x": {"field": "mean", "title": "Mean", **axis},
        "y": {"field": "sd", "title": "SD", **axis},
    }
    text = {"type": "text", "align": "left", "dx": 4, "color": QUIET}
    layers = [
        {
            "data": {"values": lines},
            "mark": {"type": "line", "color": QUIET, "strokeDash": [5, 4]},
            "encoding": {**place, "detail": {"field": "cv"}},
        },
        {
            "data": {"values": lines[1::2]},
            "mark": text,
            "encoding": {**place, "text": {"field": "cv"}},
        },
        {
            "mark": {"type": "point", "size": 36},
            "encoding": {
                **place,
                "shape": _by_arm(["circle", "triangle-up"]),
                "stroke": _by_arm([OCHRE, DEEP]),
            },
        },
    ]
    body = {"width": 380, "height": 320, "layer": layers}
    return spec(f"Mean against SD: {outcome}", values, body)


def _by_arm(looks: list[str]) -> Spec:
    scale = {"domain": ["control", "treatment"], "range": looks}
    return {
        "field": "arm",
        "type": "nominal",
        "title": None,
        "scale": scale,
        "legend": {"orient": "top"},
    }


def spec(title: str, values: list[Spec], body: Spec) -> Spec:
    """Join title, values and drawing."""
    return {"$schema": SCHEMA, "title": title, "data": {"values": values}, "config": CONFIG, **body}
