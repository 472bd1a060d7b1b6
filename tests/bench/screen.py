"""What the screen costs: ``python -m tests.bench.screen``.

A live list of 500 rows and 12 columns that changes each tick, the chart and the strip, and what the
red look adds. Processor times of this machine, and ratios from the same run; bytes are for 256
colours.
"""

from __future__ import annotations

import asyncio
import math
import statistics
import time
from collections.abc import Callable, Sequence
from typing import Any

from rich.color import ColorSystem
from textual.app import App, ComposeResult
from textual.filter import LineFilter

from tests.bench.image import best_s, line
from tui.look import CleanFilter, RedFilter
from tui.paint.canvas import Stroke
from tui.paint.chart import Chart, Curve, paint_chart
from tui.paint.night_axis import NightAxis
from tui.paint.night_strip import Block, NightStrip, paint_strip
from tui.paint.spans import Span
from tui.widgets import Column, LiveList, Row

ROWS, COLUMNS, TICKS = 500, 12, 40
SIZE = (160, 50)
SAMPLES = 200


class Listing(App[None]):
    """A live list alone, with or without the red look's filters."""

    CSS = "LiveList { height: 1fr; }"

    def __init__(self, filters: Sequence[LineFilter]) -> None:
        super().__init__()
        self._added = filters

    def compose(self) -> ComposeResult:
        """Hold the list."""
        yield LiveList([Column(f"c{n}", 10, right=n > 0, rank=n) for n in range(COLUMNS)])

    def get_line_filters(self) -> Sequence[LineFilter]:
        """Return Textual's own and those to be measured."""
        return [*super().get_line_filters(), *self._added]


def rows(tick: int, every: int) -> list[Row]:
    """Return all rows; one cell of every so many has changed since the tick before."""

    def text(number: int, column: int) -> str:
        moving = tick if column == 5 and number % every == 0 else 0
        return f"{(number * 7 + column * 13 + moving) % 1000 / 10:.1f}"

    return [Row(f"k{n}", tuple(Span(text(n, c)) for c in range(COLUMNS))) for n in range(ROWS)]


async def ticks(every: int, filters: Sequence[LineFilter]) -> tuple[float, float]:
    """Return the median processor time of a tick (s), drawing included, and its bytes (mean)."""
    app = Listing(filters)
    app.console._color_system = ColorSystem.EIGHT_BIT
    spent, sent = [], 0
    async with app.run_test(size=SIZE) as pilot:
        await pilot.pause()
        compositor: Any = app.screen._compositor
        draw = compositor.render_update

        def counted(*arguments: Any, **settings: Any) -> Any:
            nonlocal sent
            update = draw(*arguments, **settings)
            if hasattr(update, "render_segments"):
                sent += len(update.render_segments(app.console).encode())
            return update

        compositor.render_update = counted
        for tick in range(TICKS):
            made = rows(tick + 1, every)
            begin = time.process_time()
            app.query_one(LiveList).set_rows(made)
            await asyncio.sleep(0.04)
            spent.append(time.process_time() - begin)
    return statistics.median(spent), sent / TICKS


def curves() -> Chart:
    """Return a chart of six curves over a night."""
    return Chart(
        curves=tuple(
            Curve(
                [80.0 * math.sin(math.pi * (at / SAMPLES + shift / 8)) for at in range(SAMPLES)],
                Stroke("text", 1 + shift % 3),
                (f"target {shift}",),
            )
            for shift in range(6)
        ),
        axis=NightAxis(
            12.0,
            18.5,
            4.8,
            [min(at // 12, (SAMPLES - at) // 12, 4) for at in range(SAMPLES)],
        ),
        limit_deg=[20.0] * SAMPLES,
        airmass_marks=((60.0, "1.15"), (30.0, "1.99")),
    )


def strip() -> NightStrip:
    """Return a strip with thirty visits."""
    return NightStrip(
        hours=12.0,
        begin_hour=18.5,
        now_h=4.0,
        sun_deg=lambda hour: -40.0 * math.sin(math.pi * hour / 12.0),
        moon_deg=lambda hour: 8.0 * hour - 30.0,
        planned=tuple(Block(4 + n * 0.25, 4.25 + n * 0.25, f"{n} target") for n in range(30)),
        moon_label="89% lit",
    )


def painter(what: str, work: Callable[[], object]) -> None:
    """Print what one painter takes."""
    line(what, best_s(work) * 1e3)


def main() -> None:
    """Measure and print."""
    red = (RedFilter(), CleanFilter())
    few_s, few_bytes = asyncio.run(ticks(100, ()))
    red_s, red_bytes = asyncio.run(ticks(100, red))
    all_s, all_bytes = asyncio.run(ticks(1, ()))
    all_red_s, _ = asyncio.run(ticks(1, red))
    print(f"a live list of {ROWS} x {COLUMNS} at {SIZE[0]}x{SIZE[1]}, processor time of one tick")
    line("one row in 100 changes", few_s * 1e3, f"{few_bytes:.0f} bytes")
    line("  the same in red", red_s * 1e3, f"{red_bytes:.0f} bytes")
    line("every row changes", all_s * 1e3, f"{all_bytes:.0f} bytes")
    line("  the same in red", all_red_s * 1e3, f"{all_red_s / all_s:.2f} of it")
    chart, night = curves(), strip()
    painter("a chart of six curves, 100 x 20", lambda: paint_chart(chart, 100, 20))
    painter("the night's strip, 160 wide", lambda: paint_strip(night, 160))


if __name__ == "__main__":
    main()
