"""Altitude against time: curves over bands of twilight, airmass on the right, hours below."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, field

from tui.paint.canvas import Canvas, Scale, Stroke
from tui.paint.night_axis import NightAxis, draw_night, hours_line
from tui.paint.spans import Line, Span

LEFT_WIDTH, RIGHT_WIDTH = 4, 6
ALTITUDE = Scale(0.0, 90.0)


@dataclass(frozen=True, slots=True)
class Curve:
    """A curve: altitudes (deg, NaN for a gap) at even steps across the chart, and its stroke.

    ``labels`` are tried in turn, near its highest point, until one finds room.
    """

    altitude_deg: Sequence[float]
    stroke: Stroke = field(default_factory=Stroke)
    labels: tuple[str, ...] = ()


@dataclass(frozen=True, slots=True)
class Chart:
    """What a chart shows.

    ``limit_deg`` holds, at even steps, the lowest altitude allowed; ``airmass_marks`` are
    (altitude_deg, text) for the right edge. The first curves are drawn first, and the last of them
    is labelled first.
    """

    curves: tuple[Curve, ...]
    axis: NightAxis
    limit_deg: Sequence[float]
    airmass_marks: tuple[tuple[float, str], ...] = ()


def paint_chart(chart: Chart, width: int, height: int) -> list[Line]:
    """Return a chart in so many rows of so many cells, the last one the hours."""
    canvas = Canvas(max(width - LEFT_WIDTH - RIGHT_WIDTH, 4), height - 1)
    draw_night(canvas, chart.axis)
    _draw_limit(canvas, chart.limit_deg)
    for curve in chart.curves:
        canvas.curve(curve.altitude_deg, ALTITUDE, curve.stroke)
    for curve in reversed(chart.curves):
        _label(canvas, curve)
    right = {ALTITUDE.row(altitude, canvas.rows): text for altitude, text in chart.airmass_marks}
    left = {ALTITUDE.row(degrees, canvas.rows): f"{degrees:2d}°" for degrees in (60, 30)}
    rows = [
        (
            Span(left.get(row, "").ljust(LEFT_WIDTH), "dim"),
            *cells,
            Span(f" {right.get(row, '')}".ljust(RIGHT_WIDTH), "dim"),
        )
        for row, cells in enumerate(canvas.lines())
    ]
    hours = hours_line(chart.axis, canvas.columns)
    return [*rows, (Span(" " * LEFT_WIDTH), *hours, Span(" " * RIGHT_WIDTH))]


def _draw_limit(canvas: Canvas, limit_deg: Sequence[float]) -> None:
    """Hatch what is below the lowest altitude allowed."""
    for column in range(canvas.columns):
        share = (column + 0.5) / canvas.columns
        limit = limit_deg[min(int(share * len(limit_deg)), len(limit_deg) - 1)]
        for row in range(canvas.rows):
            altitude = (1.0 - (row + 0.5) / canvas.rows) * ALTITUDE.high
            if altitude < limit:
                canvas.ground(row, column, "╱" if (row + column) % 2 else " ", "dim")


def _label(canvas: Canvas, curve: Curve) -> None:
    """Write a curve's label near where it stands highest."""
    seen = [
        (-math.inf if math.isnan(value) else value, at)
        for at, value in enumerate(curve.altitude_deg)
    ]
    highest, at = max(seen, default=(-math.inf, 0))
    if curve.labels and ALTITUDE.low <= highest <= ALTITUDE.high:
        row = ALTITUDE.row(highest, canvas.rows)
        column = canvas.column((at + 0.5) / len(curve.altitude_deg))
        canvas.label(row, column, curve.labels, curve.stroke.role)
