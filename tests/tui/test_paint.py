"""Painters: plain data in, lines out, always as wide as asked."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from tui.paint.canvas import Canvas, Scale, Stroke
from tui.paint.chart import Chart, Curve, paint_chart
from tui.paint.figures import bar, large, minutes_seconds, pips
from tui.paint.night_axis import NightAxis
from tui.paint.night_strip import Block, NightStrip, paint_strip
from tui.paint.spans import (
    Span,
    cut,
    fitted,
    line,
    phrases,
    spread,
    whole_phrases,
    width_of,
    wrapped,
)
from tui.paint.trend import Trend, paint_trend


def text_of(spans: tuple[Span, ...]) -> str:
    """Return a line as text."""
    return "".join(span.text for span in spans)


@given(st.text(max_size=60), st.integers(1, 40))
def test_fitted_text_has_its_width(text: str, width: int) -> None:
    """Whatever the text, wide characters too, it takes exactly its cells."""
    assert width_of([Span(fitted(text.replace("\n", " "), width))]) == width


@given(st.lists(st.text("abc XYZ", max_size=12), max_size=6), st.integers(0, 40))
def test_a_cut_line_is_no_wider(texts: list[str], width: int) -> None:
    """Cutting keeps the beginning and never goes over."""
    spans = tuple(Span(text) for text in texts)
    assert width_of(cut(spans, width)) <= width
    assert text_of(cut(spans, 1000)) == "".join(texts)


def test_spread_puts_the_right_part_at_the_edge() -> None:
    """The left part gives way when both don't fit."""
    told = spread(line("left"), line("right"), 20)
    assert text_of(told) == "left           right"
    assert text_of(spread(line("a long left part"), line("right"), 12)).endswith("right")


@given(st.text("ab ", max_size=80), st.integers(8, 30), st.integers(1, 4), st.integers(0, 3))
def test_wrapped_text_fits(text: str, width: int, lines: int, indent: int) -> None:
    """No more lines than asked, none wider, no word lost while there is room."""
    told = wrapped(text, width, "text", lines, indent)
    assert len(told) <= lines
    assert all(width_of(each) <= width for each in told)


@pytest.mark.parametrize(
    ("seconds", "text"),
    [(125.0, "2:05"), (59.2, "1:00"), (0.0, "0:00"), (-3.0, "0:00"), (3725.0, "1:02:05")],
)
def test_count_downs(seconds: float, text: str) -> None:
    """Rounded up, so that nothing is over before it is; never negative."""
    assert minutes_seconds(seconds) == text
    rows = large(text)
    assert len(rows) == 3
    assert len({width_of(row) for row in rows}) == 1


def test_bars_and_pips() -> None:
    """A bar fills its share; pips count, or figures where they are too many."""
    assert bar(0.5, 8) == "████    "
    assert bar(-1.0, 4) == "    "
    assert bar(2.0, 4) == "████"
    assert pips(2, 4) == "●●○○"
    assert pips(6, 4) == "●●●●"
    assert pips(3, 40) == "3/40"


def a_strip(now_h: float = 3.0) -> NightStrip:
    """Return twelve hours from 18 h, dark in the middle, the Moon up in the second half."""
    return NightStrip(
        hours=12.0,
        begin_hour=18.0,
        now_h=now_h,
        sun_deg=lambda h: 10.0 - 10.0 * h if h < 6.0 else 10.0 * (h - 11.0),
        moon_deg=lambda h: 10.0 * (h - 6.0),
        planned=(
            Block(3.0, 5.0, "1 First"),
            Block(5.0, 5.2, "2 Second"),
            Block(6.0, 9.0, "3 Third"),
        ),
        done=(Block(1.0, 2.0, "━", "good"), Block(2.0, 2.1, "×", "bad")),
        lost=(Block(2.2, 2.9, role="lost"),),
        moon_label="89% lit",
    )


@pytest.mark.parametrize("width", [40, 80, 160])
def test_the_strip_is_five_rows_as_wide_as_asked(width: int) -> None:
    """Hours, light, Moon, plan, done; now stands in each where nothing else does."""
    rows = paint_strip(a_strip(), width)
    assert [width_of(row) for row in rows] == [width] * 5
    hours, light, moon, plan, done = (text_of(row) for row in rows)
    assert "▼" in hours
    assert "20" in hours
    assert "│" in light
    assert light[6] == "█"
    assert "·" in light
    assert "89% lit" in moon
    assert ("▏1 First" if width > 40 else "▏1 ") in plan
    assert "━" in done
    assert "×" in done
    assert "╌" in done


def test_a_chart_has_its_curve_limit_and_now() -> None:
    """The curve peaks where its altitude does; below the limit the ground is hatched."""
    altitudes = [90.0 * (1.0 - abs(x - 50) / 50.0) for x in range(100)]
    chart = Chart(
        curves=(Curve(altitudes, Stroke("accent"), ("Star",)),),
        axis=NightAxis(10.0, 19.5, 2.5, [0] * 20 + [4] * 60 + [0] * 20),
        limit_deg=[20.0] * 100,
        airmass_marks=((60.0, "1.15"),),
    )
    rows = paint_chart(chart, 80, 12)
    assert len(rows) == 12
    assert {width_of(row) for row in rows} == {80}
    told = [text_of(row) for row in rows]
    assert "▲" in told[-1]
    assert "23" in told[-1]
    told = told[:-1]
    assert any("Star" in row for row in told[:2])
    assert any("1.15" in row for row in told)
    assert any("╱" in row for row in told[-3:])
    assert not any("╱" in row for row in told[:6])
    dots = [[i for i, c in enumerate(row) if 0x2800 < ord(c) <= 0x28FF] for row in told]
    assert dots[-1][0] < dots[5][0] < dots[5][-1] < dots[-1][-1]


@given(
    st.lists(st.text("abc ", min_size=1, max_size=9), min_size=1, max_size=5), st.integers(9, 50)
)
def test_phrases_are_whole_or_not_there(parts: list[str], width: int) -> None:
    """Text parted by commas loses its last phrases, spans in groups those that do not fit."""
    text = ", ".join(parts)
    told = whole_phrases(text, width)
    assert text.startswith(told)
    assert len(told) <= width
    assert told == text or text[len(told) :].startswith(", ")
    shown = phrases(width, *(line(Span(part)) for part in parts))
    assert width_of(shown) <= width
    left = iter(parts)
    assert all(span.text in left for span in shown)


def test_a_canvas_keeps_labels_apart() -> None:
    """Labels near the same place all find room, on different cells, and off the curve."""
    canvas = Canvas(40, 10)
    canvas.curve([45.0] * 40, Scale(0.0, 90.0), Stroke())
    assert all(canvas.label(5, 20, (name,), "strong") for name in ("First", "Second", "Third"))
    told = [text_of(row) for row in canvas.lines()]
    for name in ("First", "Second", "Third"):
        assert sum(name in row for row in told) == 1
    curve = next(row for row in told if any(0x2800 < ord(c) <= 0x28FF for c in row))
    assert not any(name in curve for name in ("First", "Second", "Third"))


def test_a_trend_has_its_points_band_and_level() -> None:
    """Points stand at their values, the band is only where something is foretold."""
    half = [math.nan] * 50 + [1.2] * 50
    trend = Trend(
        axis=NightAxis(10.0, 19.0, 5.0),
        points=((0.1, 0.8), (0.4, 1.6)),
        middle=half,
        low=[v - 0.3 for v in half],
        high=[v + 0.3 for v in half],
        level=(1.4, "usual 1.4"),
    )
    rows = [text_of(row) for row in paint_trend(trend, 65, 13)]
    assert {len(row) for row in rows} == {65}
    points = [(row, each.index("●")) for row, each in enumerate(rows) if "●" in each]
    assert [column for _, column in points] == [5 + 24, 5 + 6]
    assert any("usual 1.4" in each for each in rows)
    dots = [at for each in rows for at, c in enumerate(each) if 0x2800 < ord(c) <= 0x28FF]
    assert min(dots) >= 5 + 30
