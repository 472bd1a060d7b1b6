"""The night as a strip of time: light, Moon, what is planned, what was done, and now."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass, field

from tui.paint.canvas import joined
from tui.paint.night_axis import NightAxis, hours_line
from tui.paint.spans import Line, Span, fitted

# Darkness by the Sun's altitude: day, civil, nautical, astronomical twilight, night.
TWILIGHT = ((-50.0 / 60.0, "█"), (-6.0, "▓"), (-12.0, "▒"), (-18.0, "░"))
# The Moon's altitude in eight steps of a cell.
HEIGHTS = " ▁▂▃▄▅▆▇█"
LABEL_WIDTH = 6
ALL_ROWS = 5


@dataclass(frozen=True, slots=True)
class Block:
    """A stretch of the strip (hours from its beginning): a label, and the role it is drawn in."""

    begin_h: float
    end_h: float
    label: str = ""
    role: str = "planned"


@dataclass(frozen=True, slots=True)
class NightStrip:
    """What the strip shows; hours run from its left edge, which is at local hour ``begin_hour``.

    ``sun_deg`` and ``moon_deg`` give altitudes at an hour of the strip.
    """

    hours: float
    begin_hour: float
    now_h: float
    sun_deg: Callable[[float], float]
    moon_deg: Callable[[float], float]
    planned: tuple[Block, ...] = ()
    done: tuple[Block, ...] = ()
    lost: tuple[Block, ...] = ()
    moon_label: str = ""
    roles: tuple[str, str] = field(default=("planned", "planned2"))


def paint_strip(strip: NightStrip, width: int, rows: int = ALL_ROWS) -> list[Line]:
    """Return the strip's five rows: hours, light, Moon, plan, done.

    With room for fewer, two: hours, and what was done before now with what is planned after it.
    """
    columns = max(width - LABEL_WIDTH, 10)
    now = int(strip.now_h / strip.hours * columns)
    if rows < ALL_ROWS:
        plan, done = _plan(strip, columns, now), _done(strip, columns, now)
        both = [p if d.text == " " else d for p, d in zip(plan, done, strict=True)]
        return [
            _labelled("", _hours(strip, columns)),
            _labelled("night", both),
        ]
    return [
        _labelled("", _hours(strip, columns)),
        _labelled("light", _light(strip, columns, now)),
        _labelled("Moon", _moon(strip, columns, now)),
        _labelled("plan", _plan(strip, columns, now)),
        _labelled("done", _done(strip, columns, now)),
    ]


def _labelled(label: str, cells: Iterable[Span]) -> Line:
    return (Span(label.ljust(LABEL_WIDTH), "dim"), *joined(cells))


def _hour_of(strip: NightStrip, column: int, columns: int) -> float:
    return (column + 0.5) / columns * strip.hours


def _hours(strip: NightStrip, columns: int) -> Line:
    axis = NightAxis(strip.hours, strip.begin_hour, strip.now_h)
    return hours_line(axis, columns, "▼")


def _light(strip: NightStrip, columns: int, now: int) -> list[Span]:
    cells = []
    for column in range(columns):
        altitude = strip.sun_deg(_hour_of(strip, column, columns))
        glyph = next((glyph for limit, glyph in TWILIGHT if altitude > limit), "·")
        cells.append(Span(glyph, "sky"))
    return _with_now(cells, now)


def _moon(strip: NightStrip, columns: int, now: int) -> list[Span]:
    cells = []
    for column in range(columns):
        altitude = strip.moon_deg(_hour_of(strip, column, columns))
        step = 0 if altitude <= 0.0 else min(1 + int(altitude / 90.0 * 8.0), 8)
        cells.append(Span(HEIGHTS[step], "moon"))
    down = [at for at, cell in enumerate(cells) if cell.text == " "]
    if len(down) > len(strip.moon_label) + 1 and strip.moon_label:
        for offset, character in enumerate(strip.moon_label):
            at = down[0] + 1 + offset
            if at in down:
                cells[at] = Span(character, "dim")
    return _with_now(cells, now)


def _plan(strip: NightStrip, columns: int, now: int) -> list[Span]:
    cells = [Span(" ")] * columns
    for number, block in enumerate(strip.planned):
        role = strip.roles[number % 2]
        begin, end = _columns_of(block, strip, columns)
        text = _label(block.label, end - begin)
        for offset, character in enumerate(text):
            cells[begin + offset] = Span(character, role)
    return _with_now(cells, now, over=False)


def _label(label: str, width: int) -> str:
    """Return a block in so many cells: its edge, then its label whole, or its first word."""
    first = label.split(" ")[0]
    text = label if len(label) < width else first if len(first) < width else ""
    return fitted(f"▏{text}", width)


def _done(strip: NightStrip, columns: int, now: int) -> list[Span]:
    cells = [Span(" ")] * columns
    for block, glyph in [
        *((block, "╌") for block in strip.lost),
        *((block, block.label or "━") for block in strip.done),
    ]:
        begin, end = _columns_of(block, strip, columns)
        for at in range(begin, max(end, begin + 1)):
            if at < columns:
                cells[at] = Span(glyph[0], block.role)
    return _with_now(cells, now, over=False)


def _columns_of(block: Block, strip: NightStrip, columns: int) -> tuple[int, int]:
    begin, end = (round(hour / strip.hours * columns) for hour in (block.begin_h, block.end_h))
    return min(max(begin, 0), columns), min(max(end, 0), columns)


def _with_now(cells: list[Span], now: int, over: bool = True) -> list[Span]:
    if 0 <= now < len(cells) and (over or cells[now].text == " "):
        cells[now] = Span("│", "now")
    return cells
