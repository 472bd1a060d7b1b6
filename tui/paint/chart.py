"""Altitude against time in braille: curves over bands of twilight, airmass on the right.

Curves are told apart by their dots (every dot, every second, every third) and by the label at their
end, so that they can be told apart in red, where there is one hue.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tui.paint.spans import Line, Span

# The bits of the eight dots of a braille cell, by column and row.
_DOTS = ((0x01, 0x02, 0x04, 0x40), (0x08, 0x10, 0x20, 0x80))
_BRAILLE = 0x2800
LEFT_WIDTH, RIGHT_WIDTH = 4, 6
HIGHEST_DEG = 90.0


@dataclass(frozen=True, slots=True)
class Curve:
    """A curve: altitudes (deg) at even steps across the chart, its role, how dense its dots are."""

    altitude_deg: Sequence[float]
    role: str
    every: int = 1
    label: str = ""


@dataclass(frozen=True, slots=True)
class Chart:
    """What a chart shows. ``dark`` holds, at even steps, how dark it is: 0 day to 4 night.

    ``limit_deg`` holds, at even steps, the lowest altitude allowed; ``now`` is a share of the
    width. ``airmass_marks`` are (altitude_deg, text) for the right edge.
    """

    curves: tuple[Curve, ...]
    dark: Sequence[int]
    limit_deg: Sequence[float]
    now: float
    airmass_marks: tuple[tuple[float, str], ...] = ()


def paint_chart(chart: Chart, width: int, height: int) -> list[Line]:
    """Return a chart in so many rows of so many cells."""
    columns = max(width - LEFT_WIDTH - RIGHT_WIDTH, 4)
    bits = [[0] * columns for _ in range(height)]
    roles = [[""] * columns for _ in range(height)]
    for curve in chart.curves:
        _draw(curve, bits, roles, columns, height)
    now = int(chart.now * columns)
    rows = []
    for row in range(height):
        cells = [
            _cell(chart, bits, roles, (row, column), now, (height, columns))
            for column in range(columns)
        ]
        left, right = (
            Span(_left_mark(row, height), "dim"),
            Span(_right_mark(chart, row, height), "dim"),
        )
        rows.append(_joined([left, *cells, right]))
    return _with_labels(rows, chart, columns, height)


def _draw(
    curve: Curve, bits: list[list[int]], roles: list[list[str]], columns: int, height: int
) -> None:
    before: int | None = None
    for x in range(columns * 2):
        altitude = _sample(curve.altitude_deg, (x + 0.5) / (columns * 2))
        if not 0.0 <= altitude <= HIGHEST_DEG:
            before = None
            continue
        y = min(int((1.0 - altitude / HIGHEST_DEG) * height * 4), height * 4 - 1)
        # A steep piece is drawn whole, so that a curve has no gaps.
        low, high = (y, y) if before is None else (min(before, y), max(before, y))
        before = y
        if x % curve.every:
            continue
        for each in range(low, high + 1):
            row, column = each // 4, x // 2
            bits[row][column] |= _DOTS[x % 2][each % 4]
            roles[row][column] = curve.role


def _sample(values: Sequence[float], share: float) -> float:
    return float(values[min(int(share * len(values)), len(values) - 1)])


def _cell(
    chart: Chart,
    bits: list[list[int]],
    roles: list[list[str]],
    where: tuple[int, int],
    now: int,
    size: tuple[int, int],
) -> Span:
    (row, column), (height, columns) = where, size
    if bits[row][column]:
        return Span(chr(_BRAILLE + bits[row][column]), roles[row][column])
    if column == now:
        return Span("│", "now")
    share = (column + 0.5) / columns
    altitude = (1.0 - (row + 0.5) / height) * HIGHEST_DEG
    if altitude < _sample(chart.limit_deg, share):
        return Span("╱" if (row + column) % 2 else " ", "dim")
    dark = int(_sample(chart.dark, share))
    return Span("▓▒░  "[dark] if dark < 3 else " ", "sky")


def _left_mark(row: int, height: int) -> str:
    for degrees in (60, 30):
        if row == int((1.0 - degrees / HIGHEST_DEG) * height):
            return f"{degrees:2d}° "
    return " " * LEFT_WIDTH


def _right_mark(chart: Chart, row: int, height: int) -> str:
    for altitude, text in chart.airmass_marks:
        if row == min(int((1.0 - altitude / HIGHEST_DEG) * height), height - 1):
            return f" {text}".ljust(RIGHT_WIDTH)
    return " " * RIGHT_WIDTH


def _joined(spans: list[Span]) -> Line:
    out: list[Span] = []
    for span in spans:
        if out and out[-1].role == span.role:
            out[-1] = Span(out[-1].text + span.text, span.role)
        else:
            out.append(span)
    return tuple(out)


def _with_labels(rows: list[Line], chart: Chart, columns: int, height: int) -> list[Line]:
    """Write each curve's label where it stands highest, on the row above it."""
    for curve in chart.curves:
        if not curve.label or len(curve.altitude_deg) == 0:
            continue
        values = [v if 0.0 <= v <= HIGHEST_DEG else -1.0 for v in curve.altitude_deg]
        best = max(range(len(values)), key=values.__getitem__)
        if values[best] < 0.0:
            continue
        row = max(int((1.0 - values[best] / HIGHEST_DEG) * height) - 1, 0)
        at = min(int(best / len(values) * columns), max(columns - len(curve.label), 0))
        rows[row] = _written(rows[row], LEFT_WIDTH + at, Span(curve.label, curve.role))
    return rows


def _written(row: Line, at: int, label: Span) -> Line:
    cells = [Span(character, span.role) for span in row for character in span.text]
    for offset, character in enumerate(label.text[: max(len(cells) - at - RIGHT_WIDTH, 0)]):
        cells[at + offset] = Span(character, label.role)
    return _joined(cells)
