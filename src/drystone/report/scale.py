"""One horizontal scale for ratios: log distances, ticks that read as percent change."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np

from drystone.report.numbers import MINUS, percent_interval

TICKS = (-99, -95, -90, -80, -65, -50, -35, -20, -10, 0, 10, 25, 50, 100, 200, 400, 900, 2900, 9900)
FINE_TICKS = (-8, -6, -4, -2, 0, 2, 4, 6, 8, 10)
FINEST_TICKS = (-2, -1.5, -1, -0.5, 0, 0.5, 1, 1.5, 2)
CLOSEST_TICKS = 9.0  # percent of the width, so that labels do not touch


@dataclass(frozen=True)
class Tick:
    """Mark on the scale: ``at`` in percent of the width, ``value`` as log ratio."""

    at: float
    value: float
    label: str
    is_zero: bool


@dataclass(frozen=True)
class Bar:
    """Interval on the scale; all positions in percent of the width.

    ``cut_low`` and ``cut_high`` say that the interval runs beyond the scale, ``inside`` whether
    the estimate itself is on it.
    """

    low: float
    high: float
    at: float
    cut_low: bool
    cut_high: bool
    inside: bool

    @property
    def width(self) -> float:
        """Width in percent, never invisible."""
        return max(self.high - self.low, 0.3)


@dataclass(frozen=True)
class RatioScale:
    """Log ratios from ``low`` to ``high`` over the whole width."""

    low: float
    high: float

    def at(self, log_ratio: float) -> float:
        """Position in percent of the width, held inside 0 to 100."""
        share = (log_ratio - self.low) / (self.high - self.low)
        return round(100 * min(1.0, max(0.0, share)), 2)

    def bar(self, estimate: float, low: float, high: float) -> Bar | None:
        """Bar for an interval, or None when a number is missing."""
        if any(math.isnan(value) for value in (estimate, low, high)):
            return None
        return Bar(
            self.at(low),
            self.at(high),
            self.at(estimate),
            cut_low=low < self.low,
            cut_high=high > self.high,
            inside=self.low <= estimate <= self.high,
        )

    def ticks(self) -> tuple[Tick, ...]:
        """Round percent changes on the scale, zero always among them, none too close."""
        span = self.high - self.low
        marks = FINEST_TICKS if span < 0.05 else FINE_TICKS if span < 0.25 else TICKS
        kept = [_tick(self, 0)] if self.low <= 0 <= self.high else []
        for percent in sorted(marks, key=abs):
            log_ratio = math.log1p(percent / 100)
            far = all(abs(self.at(log_ratio) - tick.at) >= CLOSEST_TICKS for tick in kept)
            if self.low <= log_ratio <= self.high and far:
                kept.append(_tick(self, percent))
        return tuple(sorted(kept, key=lambda tick: tick.at))


def ratio_scale(estimates: Iterable[float], must_show: Iterable[float]) -> RatioScale:
    """Scale that holds zero, ``must_show`` and the bulk of ``estimates``.

    Estimates beyond three interquartile ranges may be cut (Tukey 1977, Exploratory Data Analysis,
    outer fences), so that one odd row does not flatten all others.
    """
    known = np.array([x for x in estimates if math.isfinite(x)])
    ends = [x for x in must_show if math.isfinite(x)] + [0.0]
    if known.size:
        lower, upper = np.quantile(known, [0.25, 0.75])
        reach = 3 * max(upper - lower, 0.05)
        bulk = known[(known >= lower - reach) & (known <= upper + reach)]
        ends += [float(bulk.min()), float(bulk.max())]
    low, high = min(ends), max(ends)
    room = max(0.08 * (high - low), 0.02)
    return RatioScale(low - room, high + room)


def describe(scale: RatioScale) -> str:
    """Range of the scale in words, for example '−40 to 120 %'."""
    return f"{percent_interval(scale.low, scale.high)} %"


def _tick(scale: RatioScale, percent: float) -> Tick:
    sign = MINUS if percent < 0 else "+" if percent > 0 else ""
    value = math.log1p(percent / 100)
    return Tick(scale.at(value), value, f"{sign}{abs(percent):g}", percent == 0)
