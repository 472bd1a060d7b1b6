"""Charts over a night as inline SVG: axes of local time, bands, marks, lines. Text is escaped.

Nothing is told by colour alone: marks differ in shape, bars in their fill, lines in their dashes.
"""

from __future__ import annotations

import html
import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

WIDTH = 760.0
TOP, BOTTOM = 14.0, 24.0
# Marks by place: each filter of the wheel has its own.
MARKS = ("circle", "square", "triangle", "diamond", "cross", "bar")
SIZE = 3.2


def escaped(text: object) -> str:
    """Return text that is safe within HTML and SVG, in quotes too."""
    return html.escape(str(text), quote=True)


def steps(least: float, greatest: float, about: int) -> list[float]:
    """Return round numbers (1, 2 or 5 times a power of ten apart) between two others."""
    room = greatest - least
    if not (math.isfinite(room) and room > 0.0):
        return [least] if math.isfinite(least) else []
    rough = room / max(about, 1)
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(each * power for each in (1.0, 2.0, 5.0, 10.0) if each * power >= rough * 0.999)
    first = math.ceil(least / step - 1e-9)
    return [n * step for n in range(first, math.floor(greatest / step + 1e-9) + 1)]


@dataclass(slots=True)
class Chart:
    """A chart in the making: moments (UTC MJD) across, a quantity up or rows down.

    ``flipped`` lets the quantity grow downwards, as magnitudes do.
    """

    name: str
    title: str
    about: str
    x: tuple[float, float]
    y: tuple[float, float]
    height: float = 190.0
    left: float = 48.0
    right: float = 48.0
    flipped: bool = False
    parts: list[str] = field(default_factory=list)

    def at_x(self, mjd: float) -> float:
        """Return how far across a moment is."""
        first, last = self.x
        return self.left + (mjd - first) / (last - first) * (WIDTH - self.left - self.right)

    def at_y(self, value: float) -> float:
        """Return how far down a value is."""
        least, greatest = self.y
        share = (value - least) / (greatest - least)
        share = share if self.flipped else 1.0 - share
        return TOP + share * (self.height - TOP - BOTTOM)

    def band(self, begin: float, end: float, kind: str, about: str = "") -> None:
        """Shade a stretch of time over the whole height."""
        begin, end = (min(max(each, self.x[0]), self.x[1]) for each in (begin, end))
        if end > begin:
            width = self.at_x(end) - self.at_x(begin)
            self._add(
                f'<rect class="{kind}" x="{self.at_x(begin):.1f}" y="{TOP:.1f}" '
                f'width="{width:.1f}" height="{self.height - TOP - BOTTOM:.1f}">'
                f"{_titled(about)}</rect>"
            )

    def block(self, begin: float, end: float, row: int, kind: str, about: str) -> None:
        """Draw a bar in a row, from one moment to another."""
        height = self._row_height
        width = max(self.at_x(end) - self.at_x(begin), 0.6)
        self._add(
            f'<rect class="{kind}" x="{self.at_x(begin):.1f}" y="{TOP + row * height + 2:.1f}" '
            f'width="{width:.2f}" height="{height - 4:.1f}">{_titled(about)}</rect>'
        )

    def write_on(self, begin: float, end: float, row: int, text: str) -> None:
        """Write a short word on the bars of a row, if there is room between two moments."""
        if self.at_x(end) - self.at_x(begin) > 6.5 * len(text) + 3:
            x = 0.5 * (self.at_x(begin) + self.at_x(end))
            y = TOP + (row + 0.5) * self._row_height + 3.2
            self._add(
                f'<text class="on" x="{x:.1f}" y="{y:.1f}" text-anchor="middle">'
                f"{escaped(text)}</text>"
            )

    def rows(self, labels: Sequence[str]) -> None:
        """Write the rows' names on the left, and rule between them."""
        for row, label in enumerate(labels):
            y = TOP + (row + 0.5) * self._row_height
            self._text(self.left - 6, y + 3.5, label, "end")
            self._add(
                f'<line class="grid" x1="{self.left}" x2="{WIDTH - self.right}" '
                f'y1="{y:.1f}" y2="{y:.1f}"/>'
            )

    @property
    def _row_height(self) -> float:
        return (self.height - TOP - BOTTOM) / max(self.y[1] - self.y[0], 1.0)

    def line(self, points: Sequence[tuple[float, float]], kind: str) -> None:
        """Draw a line through points (moment, value); NaN breaks it."""
        path, is_down = [], False
        for mjd, value in points:
            if not math.isfinite(value):
                is_down = False
                continue
            path.append(f"{'L' if is_down else 'M'}{self.at_x(mjd):.1f} {self.at_y(value):.1f}")
            is_down = True
        if path:
            self._add(f'<path class="{kind}" d="{" ".join(path)}"/>')

    def area(self, points: Sequence[tuple[float, float, float]], kind: str) -> None:
        """Fill between two lines, given as (moment, low, high)."""
        if points:
            there = [f"{self.at_x(t):.1f} {self.at_y(low):.1f}" for t, low, _ in points]
            back = [f"{self.at_x(t):.1f} {self.at_y(high):.1f}" for t, _, high in reversed(points)]
            self._add(f'<path class="{kind}" d="M{" L".join([*there, *back])} Z"/>')

    def mark(self, mjd: float, value: float, place: int, kind: str = "", about: str = "") -> None:
        """Put a mark; its shape goes by a place among `MARKS`. Off the chart it is left out."""
        least, greatest = self.y
        if not (math.isfinite(value) and least <= value <= greatest):
            return
        shape = MARKS[place % len(MARKS)]
        self._add(
            _mark(shape, self.at_x(mjd), self.at_y(value), f"f{place % len(MARKS)} {kind}", about)
        )

    def legend(self, names: Sequence[str], marks: bool = True) -> None:
        """Name the marks above the chart, on the right."""
        x = WIDTH - self.right
        for place in range(len(names) - 1, -1, -1):
            x -= 6.2 * len(names[place]) + 16
            kind = f"f{place % len(MARKS)}"
            if marks:
                self._add(_mark(MARKS[place % len(MARKS)], x + 4, TOP - 6, kind, ""))
            else:
                self._add(
                    f'<rect class="{kind}" x="{x:.1f}" y="{TOP - 10:.1f}" width="9" height="8"/>'
                )
            self._text(x + 12, TOP - 2.5, names[place], "start")

    def scale(self, label: str, values: Sequence[float], form: str = "{:g}") -> None:
        """Draw the scale on the left, with rules across."""
        for value in values:
            y = self.at_y(value)
            self._add(
                f'<line class="grid" x1="{self.left}" x2="{WIDTH - self.right}" '
                f'y1="{y:.1f}" y2="{y:.1f}"/>'
            )
            self._text(self.left - 5, y + 3.5, form.format(value), "end")
        self._upright(11.0, label)

    def right_scale(self, label: str, marks: Sequence[tuple[float, str]]) -> None:
        """Write values on the right, each at the height of one on the left."""
        for value, text in marks:
            self._text(WIDTH - self.right + 5, self.at_y(value) + 3.5, text, "start")
        self._upright(WIDTH - 6.0, label)

    def _upright(self, x: float, label: str) -> None:
        """Write a scale's name along it."""
        middle = TOP + (self.height - TOP - BOTTOM) / 2
        self._add(
            f'<text class="label" text-anchor="middle" '
            f'transform="translate({x:g} {middle:.1f}) rotate(-90)">{escaped(label)}</text>'
        )

    def hours(self, moments: Sequence[tuple[float, str]]) -> None:
        """Write the hours below, and rule up from them."""
        for mjd, label in moments:
            x = self.at_x(mjd)
            self._add(
                f'<line class="grid" x1="{x:.1f}" x2="{x:.1f}" y1="{TOP}" '
                f'y2="{self.height - BOTTOM:.1f}"/>'
            )
            self._text(x, self.height - BOTTOM + 14, label, "middle")

    def text(self) -> str:
        """Return the chart as one ``svg`` element, with its title and what it shows."""
        frame = (
            f'<rect class="frame" x="{self.left}" y="{TOP}" '
            f'width="{WIDTH - self.left - self.right}" height="{self.height - TOP - BOTTOM}"/>'
        )
        return (
            f'<svg viewBox="0 0 {WIDTH:g} {self.height:g}" role="img" '
            f'aria-labelledby="{self.name}-t {self.name}-d">'
            f'<title id="{self.name}-t">{escaped(self.title)}</title>'
            f'<desc id="{self.name}-d">{escaped(self.about)}</desc>'
            f"{''.join(self.parts)}{frame}</svg>"
        )

    def _add(self, part: str) -> None:
        self.parts.append(part)

    def _text(self, x: float, y: float, text: str, anchor: str) -> None:
        self._add(f'<text x="{x:.1f}" y="{y:.1f}" text-anchor="{anchor}">{escaped(text)}</text>')


def _titled(about: str) -> str:
    return f"<title>{escaped(about)}</title>" if about else ""


def _mark(shape: str, x: float, y: float, kind: str, about: str) -> str:
    body = _SHAPES[shape](x, y, SIZE)
    return f'<path class="mark {kind.strip()}" d="{body}">{_titled(about)}</path>'


def _circle(x: float, y: float, r: float) -> str:
    arc = f"a{r} {r} 0 1 0"
    return f"M{x - r:.1f} {y:.1f} {arc} {2 * r:.1f} 0 {arc} {-2 * r:.1f} 0Z"


def _square(x: float, y: float, r: float) -> str:
    side = 1.8 * r
    return f"M{x - 0.9 * r:.1f} {y - 0.9 * r:.1f}h{side:.1f}v{side:.1f}h{-side:.1f}Z"


def _triangle(x: float, y: float, r: float) -> str:
    return f"M{x:.1f} {y - 1.2 * r:.1f}l{1.15 * r:.1f} {2.1 * r:.1f}h{-2.3 * r:.1f}Z"


def _diamond(x: float, y: float, r: float) -> str:
    wide, high = 1.1 * r, 1.3 * r
    return (
        f"M{x:.1f} {y - high:.1f}l{wide:.1f} {high:.1f}l{-wide:.1f} {high:.1f}"
        f"l{-wide:.1f} {-high:.1f}Z"
    )


def _cross(x: float, y: float, r: float) -> str:
    return (
        f"M{x - r:.1f} {y - r:.1f}l{2 * r:.1f} {2 * r:.1f}m0 {-2 * r:.1f}l{-2 * r:.1f} {2 * r:.1f}"
    )


def _bar(x: float, y: float, r: float) -> str:
    return f"M{x:.1f} {y - 1.3 * r:.1f}v{2.6 * r:.1f}m{-1.3 * r:.1f} {-1.3 * r:.1f}h{2.6 * r:.1f}"


_SHAPES: dict[str, Callable[[float, float, float], str]] = {
    "circle": _circle,
    "square": _square,
    "triangle": _triangle,
    "diamond": _diamond,
    "cross": _cross,
    "bar": _bar,
}
