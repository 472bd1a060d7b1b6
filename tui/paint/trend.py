"""A quantity against the night: what was measured as points, what is foretold in a band."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

from tui.paint.canvas import Canvas, Scale, Stroke
from tui.paint.night_axis import NightAxis, hours_line
from tui.paint.spans import Line, Span

LEFT_WIDTH = 5
# The steps of a scale, of which the smallest that gives few enough marks is taken.
STEPS = (0.1, 0.2, 0.5, 1.0, 2.0, 5.0)


@dataclass(frozen=True, slots=True)
class Trend:
    """What a trend shows.

    ``points`` are (share of the width, value); ``middle``, ``low`` and ``high`` stand at even steps
    across it, NaN where nothing is foretold. ``level`` is a value to compare with, and its name.
    """

    axis: NightAxis
    points: tuple[tuple[float, float], ...]
    middle: Sequence[float]
    low: Sequence[float]
    high: Sequence[float]
    level: tuple[float, str]


def paint_trend(trend: Trend, width: int, height: int) -> list[Line]:
    """Return a trend in so many rows of so many cells, the last one the hours."""
    canvas = Canvas(width - LEFT_WIDTH, height - 1)
    values = [value for _, value in trend.points] + [trend.level[0]]
    values += [value for value in (*trend.low, *trend.high) if not math.isnan(value)]
    scale, step = scale_for(min(values), max(values), canvas.rows)
    canvas.upright(trend.axis.now, "│", "now")
    canvas.level(trend.level[0], scale, "┄", "dim")
    canvas.band(trend.low, trend.high, scale, "dim")
    canvas.curve(trend.middle, scale, Stroke("accent"))
    for share, value in trend.points:
        canvas.point(share, value, scale, Span("●", "strong"))
    name = trend.level[1]
    canvas.label(scale.row(trend.level[0], canvas.rows), len(name), (name,), "dim")
    marks: dict[int, str] = {}
    for count in range(round(scale.low / step), round(scale.high / step) + 1):
        marks.setdefault(scale.row(count * step, canvas.rows), f"{count * step:.1f}")
    rows = [
        (Span(marks.get(row, "").rjust(LEFT_WIDTH - 1) + " ", "dim"), *cells)
        for row, cells in enumerate(canvas.lines())
    ]
    return [*rows, (Span(" " * LEFT_WIDTH), *hours_line(trend.axis, canvas.columns))]


def scale_for(least: float, most: float, rows: int) -> tuple[Scale, float]:
    """Return a scale of round ends around two values, and the step of its marks."""
    step = next((s for s in STEPS if (most - least) / s < rows / 2.0), STEPS[-1])
    low = math.floor(least / step - 0.25) * step
    return Scale(max(low, 0.0), math.ceil(most / step + 0.25) * step), step
