"""What every graph against the night's hours shares: its hours, twilight behind it, now."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from tui.paint.canvas import Canvas, joined
from tui.paint.spans import Line, Span

# The ground of a graph by how dark it is, 0 day to 4 night.
TWILIGHT_GROUND = "▓▒░  "
LEAST_CELLS_AN_HOUR = 4.0


@dataclass(frozen=True, slots=True)
class NightAxis:
    """The hours from a graph's left edge to its right, and where now is (hours from the left).

    ``begin_hour`` is the local hour at the left edge; ``dark`` holds, at even steps, how dark it
    is: 0 day, 1 civil, 2 nautical, 3 astronomical twilight, 4 night.
    """

    hours: float
    begin_hour: float
    now_h: float
    dark: Sequence[int] = (4,)

    @property
    def now(self) -> float:
        """Where now is, as a share of the width."""
        return self.now_h / self.hours


def draw_night(canvas: Canvas, axis: NightAxis) -> None:
    """Draw twilight and the marker of now as the ground of a canvas."""
    for column in range(canvas.columns):
        at = min(int((column + 0.5) / canvas.columns * len(axis.dark)), len(axis.dark) - 1)
        glyph = TWILIGHT_GROUND[axis.dark[at]]
        if glyph != " ":
            for row in range(canvas.rows):
                canvas.ground(row, column, glyph, "sky")
    canvas.upright(axis.now, "│", "now")


def hours_line(axis: NightAxis, columns: int, mark: str = "▲") -> Line:
    """Return the row of local hours for a graph of so many cells, with now marked in it."""
    cells = [Span(" ", "dim")] * columns
    now = int(axis.now * columns)
    every = 1 if columns / axis.hours >= LEAST_CELLS_AN_HOUR else 2
    whole = int(axis.begin_hour) + 1
    for hour in range(whole, whole + int(axis.hours) + 1):
        at = round((hour - axis.begin_hour) / axis.hours * columns)
        # An hour whose figures the marker would cut in two is left out.
        if hour % every == 0 and 0 <= at <= columns - 2 and not at <= now < at + 2:
            cells[at : at + 2] = [Span(figure, "dim") for figure in f"{hour % 24:02d}"]
    if 0 <= now < columns:
        cells[now] = Span(mark, "now")
    return joined(cells)
