"""Mean against spread: log SD on log mean, one point for each physical arm, with lines of equal CV.

Points along one line share a coefficient of variation, which is what an average CV supposes.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
import pandas as pd

from drystone.report import numbers
from drystone.report.facts import Record, records
from drystone.words import arms

CV_LINES = (0.03, 0.1, 0.3, 1.0)


@dataclass(frozen=True)
class SpreadPoint:
    """One physical arm; ``x`` and ``y`` in percent of the picture, from its upper left."""

    arm: str
    mean: float
    sd: float
    x: float
    y: float
    title: str


@dataclass(frozen=True)
class SpreadLine:
    """Line of equal CV, in percent of the picture."""

    x1: float
    y1: float
    x2: float
    y2: float
    label: str
    label_x: float
    label_y: float


@dataclass(frozen=True)
class AxisMark:
    """Mark of an axis, in percent of the picture."""

    at: float
    label: str


@dataclass(frozen=True)
class SpreadPicture:
    """Everything that is drawn for one outcome."""

    outcome: str
    unit: str
    points: tuple[SpreadPoint, ...]
    lines: tuple[SpreadLine, ...]
    x_marks: tuple[AxisMark, ...]
    y_marks: tuple[AxisMark, ...]
    without_sd: int
    median_cv: tuple[tuple[str, float, int], ...]


@dataclass(frozen=True)
class _Frame:
    x_low: float
    x_high: float
    y_low: float
    y_high: float

    def x(self, log_mean: float) -> float:
        return round(100 * (log_mean - self.x_low) / (self.x_high - self.x_low), 2)

    def y(self, log_sd: float) -> float:
        return round(100 * (self.y_high - log_sd) / (self.y_high - self.y_low), 2)


def arm_table(rows: pd.DataFrame) -> pd.DataFrame:
    """Physical arms with mean, SD (NaN when missing), n, side, study and outcome, each once."""
    parts = []
    for arm in arms.ARMS:
        columns = {f"{arm}_{what}": what for what in ("arm", "mean", "sd", "n", "label")}
        part = rows[["study", "outcome", "unit", *columns]].rename(columns=columns)
        parts.append(part.assign(side=arm))
    return pd.concat(parts, ignore_index=True).drop_duplicates(["study", "outcome", "side", "arm"])


def spread_pictures(rows: pd.DataFrame) -> tuple[SpreadPicture, ...]:
    """One picture for each outcome that has at least one SD."""
    table = arm_table(rows)
    found = [_picture(str(name), group) for name, group in table.groupby("outcome", sort=False)]
    return tuple(picture for picture in found if picture.points)


def _picture(outcome: str, table: pd.DataFrame) -> SpreadPicture:
    known = table[(table["sd"] > 0) & (table["mean"] > 0)]
    units = [str(unit) for unit in table["unit"].dropna().unique()]
    missing = int(table["sd"].isna().sum())
    if known.empty:
        return SpreadPicture(outcome, "", (), (), (), (), missing, ())
    frame = _frame(known)
    return SpreadPicture(
        outcome,
        ", ".join(units),
        tuple(_point(record, frame) for record in records(known)),
        _lines(frame),
        tuple(AxisMark(frame.x(at), label) for at, label in _decades(frame.x_low, frame.x_high)),
        tuple(AxisMark(frame.y(at), label) for at, label in _decades(frame.y_low, frame.y_high)),
        missing,
        tuple(_median_cv(known, arm) for arm in arms.ARMS if (known["side"] == arm).any()),
    )


def _median_cv(known: pd.DataFrame, arm: str) -> tuple[str, float, int]:
    side = known[known["side"] == arm]
    return arm, float((side["sd"] / side["mean"]).median()), len(side)


def _frame(known: pd.DataFrame) -> _Frame:
    x, y = np.log10(known["mean"]), np.log10(known["sd"])
    room_x = max(0.06 * float(x.max() - x.min()), 0.08)
    room_y = max(0.06 * float(y.max() - y.min()), 0.08)
    return _Frame(
        float(x.min()) - room_x, float(x.max()) + room_x, float(y.min()) - room_y,
        float(y.max()) + room_y,
    )  # fmt: skip


def _point(record: Record, frame: _Frame) -> SpreadPoint:
    mean, sd = float(record["mean"]), float(record["sd"])
    title = (
        f"{record['study']}, {record['side']} arm {record['arm']}: mean {numbers.number(mean)}, "
        f"SD {numbers.number(sd)}, CV {numbers.number(sd / mean, 2)}"
    )
    return SpreadPoint(
        record["side"], mean, sd, frame.x(math.log10(mean)), frame.y(math.log10(sd)), title
    )


def _lines(frame: _Frame) -> tuple[SpreadLine, ...]:
    lines = []
    for cv in CV_LINES:
        shift = math.log10(cv)
        # the part of the line that lies inside the frame
        start = max(frame.x_low, frame.y_low - shift)
        end = min(frame.x_high, frame.y_high - shift)
        if end - start > 0.08 * (frame.x_high - frame.x_low):
            x1, x2 = frame.x(start), frame.x(end)
            y1, y2 = frame.y(start + shift), frame.y(end + shift)
            label_at = start + 0.06 * (end - start)
            at = frame.x(label_at), frame.y(label_at + shift)
            lines.append(SpreadLine(x1, y1, x2, y2, f"CV {cv:g}", *at))
    return tuple(lines)


MOST_DECADES = 8


def _decades(low: float, high: float) -> list[tuple[float, str]]:
    """Round numbers on a log axis: 1, 2, 5 within a narrow range, else powers of ten."""
    steps = (1.0,) if high - low > 3 else (1.0, 3.0) if high - low > 1.2 else (1.0, 2.0, 5.0)
    every = max(1, round((high - low) / MOST_DECADES))
    found = []
    for power in range(math.floor(low), math.ceil(high) + 1, every):
        for step in steps:
            at = power + math.log10(step)
            if low <= at <= high:
                found.append((at, _decade(step, power)))
    return found


def _decade(step: float, power: int) -> str:
    """Label of step x 10^power; beyond ten digits as a power, which also cannot overflow."""
    if abs(power) > 9:
        return f"{step:g}e{power}"
    return numbers.number(step * 10.0**power, 1)
