"""A canvas of braille dots under text: what every graph of the console is drawn on.

Three layers, one over the other: a ground of single cells (twilight, what is out of reach), dots
two across and four down in a cell, and text. Curves are told apart by their dots (every one, every
second, every third, double) and by their labels, so that they can be told apart where there is one
hue or none.
"""

from __future__ import annotations

import math
from collections.abc import Iterable, Sequence
from dataclasses import dataclass

from rich.cells import cell_len

from tui.paint.spans import Line, Span

# The bits of the eight dots of a braille cell, by column and row.
_DOTS = ((0x01, 0x02, 0x04, 0x40), (0x08, 0x10, 0x20, 0x80))
_BRAILLE = 0x2800
# From how far a label still seems to belong to what it names.
NEAR_CELLS = 9.0


def _distance(up: int, along: int) -> float:
    """Return how far a label is off: a row counts as two cells, below is a little worse."""
    return 2.0 * abs(up) + abs(along) + 0.5 * (up > 0)


# Where a label may stand from what it names, as (rows, cells), the nearest first.
_AWAY = sorted(
    ((up, along) for up in (-1, 1, -2, 2, -3, 3, 0) for along in range(-14, 15)),
    key=lambda away: _distance(*away),
)
_NEAR = [away for away in _AWAY if _distance(*away) <= NEAR_CELLS]


@dataclass(frozen=True, slots=True)
class Scale:
    """What the lower and the upper edge of a canvas stand for; values between go evenly."""

    low: float
    high: float

    def share(self, value: float) -> float:
        """Return how far up a value stands, 0 at the lower edge to 1 at the upper."""
        return (value - self.low) / (self.high - self.low)

    def row(self, value: float, rows: int) -> int:
        """Return the row of a value, held to the canvas."""
        return min(max(int((1.0 - self.share(value)) * rows), 0), rows - 1)


@dataclass(frozen=True, slots=True)
class Stroke:
    """How a curve is drawn: its role, each which of its dots, and whether it is twice as thick."""

    role: str = "text"
    every: int = 1
    double: bool = False


class Canvas:
    """A field of cells to draw on; x runs from 0 to 1 over its width."""

    def __init__(self, columns: int, rows: int) -> None:
        self.columns = max(columns, 1)
        self.rows = max(rows, 1)
        self._ground = [[Span(" ")] * self.columns for _ in range(self.rows)]
        self._bits = [[0] * self.columns for _ in range(self.rows)]
        self._roles = [[""] * self.columns for _ in range(self.rows)]
        self._text: list[list[Span | None]] = [[None] * self.columns for _ in range(self.rows)]

    def column(self, share: float) -> int:
        """Return the column at a share of the width, held to the canvas."""
        return min(max(int(share * self.columns), 0), self.columns - 1)

    # Ground

    def ground(self, row: int, column: int, glyph: str, role: str) -> None:
        """Put a glyph of the ground into one cell."""
        self._ground[row][column] = Span(glyph, role)

    def upright(self, share: float, glyph: str, role: str) -> None:
        """Draw an upright line over the ground, under everything else."""
        if 0.0 <= share < 1.0:
            for row in range(self.rows):
                self.ground(row, self.column(share), glyph, role)

    def level(self, value: float, scale: Scale, glyph: str, role: str) -> None:
        """Draw a level line over the ground, under everything else."""
        if scale.low <= value <= scale.high:
            for column in range(self.columns):
                self.ground(scale.row(value, self.rows), column, glyph, role)

    # Dots

    def curve(self, values: Sequence[float], scale: Scale, stroke: Stroke) -> None:
        """Draw values that stand at even steps over the width; there is a gap where one is NaN.

        What lies beyond an edge is left out; a steep piece is drawn whole, so that it has no gaps.
        """
        before: int | None = None
        for x in range(self.columns * 2):
            y = self._dot(_sample(values, (x + 0.5) / (self.columns * 2)), scale)
            if y is None:
                before = None
                continue
            low, high = (y, y) if before is None else (min(before, y), max(before, y))
            before = y
            if x % stroke.every == 0:
                for each in range(low, high + 1 + stroke.double):
                    self._set(x, each, stroke.role)

    def band(self, lows: Sequence[float], highs: Sequence[float], scale: Scale, role: str) -> None:
        """Stipple what lies between two curves."""
        for x in range(0, self.columns * 2, 4):
            share = (x + 0.5) / (self.columns * 2)
            low, high = _sample(lows, share), _sample(highs, share)
            for y in range(x // 2 % 4, self.rows * 4, 4):
                value = scale.high - (y + 0.5) / (self.rows * 4) * (scale.high - scale.low)
                if low <= value <= high:
                    self._set(x, y, role)

    def point(self, share: float, value: float, scale: Scale, mark: Span) -> None:
        """Put a mark of one cell at a place and value, if it is on the canvas."""
        if 0.0 <= share <= 1.0 and scale.low <= value <= scale.high:
            self._text[scale.row(value, self.rows)][self.column(share)] = mark

    def _dot(self, value: float, scale: Scale) -> int | None:
        if math.isnan(value) or not scale.low <= value <= scale.high:
            return None
        return min(int((1.0 - scale.share(value)) * self.rows * 4), self.rows * 4 - 1)

    def _set(self, x: int, y: int, role: str) -> None:
        if y < self.rows * 4:
            self._bits[y // 4][x // 2] |= _DOTS[x % 2][y % 4]
            self._roles[y // 4][x // 2] = role

    # Text

    def write(self, row: int, column: int, text: str, role: str) -> None:
        """Write over everything; what does not fit at the right edge moves to the left."""
        at = max(min(column, self.columns - cell_len(text)), 0)
        for offset, character in enumerate(text[: self.columns - at]):
            self._text[row][at + offset] = Span(character, role)

    def label(self, row: int, column: int, texts: Iterable[str], role: str) -> bool:
        """Write the first of these texts that finds a free place near a cell; say whether one did.

        A place is free when no text stands in or next to it and no dots are in it.
        """
        tried = list(texts)
        for text in tried:
            length = cell_len(text)
            # A long label far off would be taken for another's: rather a short one near by.
            places = _AWAY if text is tried[-1] else _NEAR
            for up, along in places:
                at = column - length // 2 + along
                if self._is_free(row + up, at, length):
                    self.write(row + up, at, text, role)
                    return True
        return False

    def _is_free(self, row: int, column: int, length: int) -> bool:
        if not (0 <= row < self.rows and column >= 0 and column + length <= self.columns):
            return False
        around = self._text[row][max(column - 1, 0) : column + length + 1]
        dots = self._bits[row][column : column + length]
        return not any(around) and not any(dots)

    # What comes out

    def lines(self) -> list[Line]:
        """Return the canvas as lines exactly as wide as it."""
        return [self._line(row) for row in range(self.rows)]

    def _line(self, row: int) -> Line:
        return joined(self._cell(row, column) for column in range(self.columns))

    def _cell(self, row: int, column: int) -> Span:
        text, bits = self._text[row][column], self._bits[row][column]
        if text is not None:
            return text
        if bits:
            return Span(chr(_BRAILLE + bits), self._roles[row][column])
        return self._ground[row][column]


def joined(cells: Iterable[Span]) -> Line:
    """Return single cells as a line, neighbours of one role together."""
    runs: list[list[str]] = []
    roles: list[str] = []
    for text, role in cells:
        if roles and roles[-1] == role:
            runs[-1].append(text)
        else:
            roles.append(role)
            runs.append([text])
    return tuple(Span("".join(run), role) for run, role in zip(runs, roles, strict=True))


def _sample(values: Sequence[float], share: float) -> float:
    return float(values[min(int(share * len(values)), len(values) - 1)])
