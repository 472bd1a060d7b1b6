"""What reaches the terminal in red once its depth of colour has rounded it: SGR codes are read.

The widgets are Textual's own, in Textual's own colours: whatever is drawn, the last filter rules.
"""

from __future__ import annotations

import asyncio
import re
from collections.abc import Sequence

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.color import Color as RichColor
from rich.color import ColorSystem
from rich.segment import Segment
from rich.style import Style
from textual.app import App, ComposeResult
from textual.color import Color
from textual.containers import VerticalScroll
from textual.filter import LineFilter
from textual.widgets import (
    Button,
    Checkbox,
    DataTable,
    Input,
    Label,
    ProgressBar,
    RadioButton,
    RichLog,
    Sparkline,
    Switch,
)

from tui.look import CleanFilter, RedFilter

DEPTHS = (ColorSystem.TRUECOLOR, ColorSystem.EIGHT_BIT, ColorSystem.STANDARD)
# Least contrast of text to ground, by WCAG 2.1's formula for relative luminance. Red alone reaches
# 5.25 on black; the filter's own steps give no pair below 2.5 (common practice, no source).
LEAST_CONTRAST = 2.5
Triplet = tuple[int, int, int]
colours = st.tuples(*[st.integers(0, 255)] * 3)
# The colours of xterm's defaults for the sixteen that have neither green nor blue.
SIXTEEN = {0: (0, 0, 0), 1: (205, 0, 0), 9: (255, 0, 0)}


def sgr_colours(style: Style, depth: ColorSystem) -> tuple[Triplet, Triplet]:
    """Return text and ground as the terminal is told to draw them, read out of the escape codes."""
    drawn = style.render("x", color_system=depth)
    found = re.search(r"\x1b\[([\d;]*)m", drawn)
    assert found is not None, repr(drawn)
    codes = [int(code) for code in found[1].split(";")]
    said: dict[str, Triplet] = {}
    while codes:
        code = codes.pop(0)
        if code in (38, 48):
            kind = codes.pop(0)
            length = 3 if kind == 2 else 1
            values, codes = codes[:length], codes[length:]
            said["text" if code == 38 else "ground"] = (
                (values[0], values[1], values[2]) if kind == 2 else _of_256(values[0])
            )
        elif code in (*range(30, 38), *range(90, 98)):
            said["text"] = SIXTEEN[code - 30 if code < 90 else code - 82]
        elif code in (*range(40, 48), *range(100, 108)):
            said["ground"] = SIXTEEN[code - 40 if code < 100 else code - 92]
        else:
            # Attributes: faint would take the contrast away again.
            assert code != 2
    return said["text"], said["ground"]


def _of_256(number: int) -> Triplet:
    """Return a colour of xterm's 256: a cube of 0, 95, 135 ... 255, then greys 8, 18 ... 238."""
    if number < 16:
        return SIXTEEN[number]
    if number >= 232:
        return (8 + 10 * (number - 232),) * 3
    steps = (0, 95, 135, 175, 215, 255)
    cube = number - 16
    return steps[cube // 36], steps[cube // 6 % 6], steps[cube % 6]


def luminance(colour: Triplet) -> float:
    """Return the relative luminance (0 to 1) of an sRGB colour: WCAG 2.1's definition."""
    linear = [
        each / 255 / 12.92 if each / 255 <= 0.04045 else ((each / 255 + 0.055) / 1.055) ** 2.4
        for each in colour
    ]
    return 0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2]


def contrast(one: Triplet, other: Triplet) -> float:
    """Return the contrast of two colours: 1 for the same, 21 for black and white (WCAG 2.1)."""
    low, high = sorted((luminance(one), luminance(other)))
    return (high + 0.05) / (low + 0.05)


def check(style: Style, depth: ColorSystem) -> None:
    """Check one style as it is drawn at a depth of colour."""
    text, ground = sgr_colours(style, depth)
    assert text[1:] == ground[1:] == (0, 0), (style, text, ground)
    assert contrast(text, ground) >= LEAST_CONTRAST, (style, text, ground)


def test_the_formula_agrees_with_its_source() -> None:
    """Black and white are 21 to 1, a colour and itself 1 to 1: WCAG 2.1, relative luminance."""
    assert contrast((0, 0, 0), (255, 255, 255)) == pytest.approx(21.0)
    assert contrast((175, 0, 0), (175, 0, 0)) == pytest.approx(1.0)


@pytest.mark.parametrize("depth", DEPTHS)
@given(text=colours, ground=colours, dim=st.booleans(), bold=st.booleans())
def test_any_style_is_red_at_every_depth(
    depth: ColorSystem, text: Triplet, ground: Triplet, dim: bool, bold: bool
) -> None:
    """Rounding to fewer colours brings no other hue back and leaves text that can be read."""
    style = Style(
        color=RichColor.from_rgb(*text), bgcolor=RichColor.from_rgb(*ground), dim=dim, bold=bold
    )
    red = RedFilter(sixteen_colours=depth is ColorSystem.STANDARD)
    ((_, made, _),) = red.apply([Segment("x", style)], Color(0, 0, 0))
    assert made is not None
    check(made, depth)


class Gaudy(App[None]):
    """Many of Textual's widgets, in every colour they come in, with a toast over them."""

    CSS = """
    Label { background: $success; color: $warning; }
    #same { background: black; color: black; }
    #blue { background: blue 30%; color: lime; border: heavy aqua; tint: green 20%; }
    """

    def __init__(self, depth: ColorSystem) -> None:
        super().__init__()
        self._depth = depth

    def compose(self) -> ComposeResult:
        """One of each."""
        with VerticalScroll():
            for variant in ("default", "primary", "success", "warning", "error"):
                yield Button(variant, variant=variant, compact=True)
            yield Label("black on black", id="same")
            yield Label("lime on blue", id="blue")
            yield Input(placeholder="faint", compact=True)
            yield Checkbox("box", value=True, compact=True)
            yield RadioButton("radio", value=True, compact=True)
            yield Switch(value=True)
            yield ProgressBar(total=4, show_eta=False)
            yield Sparkline([1, 5, 2, 8])
            yield DataTable(id="table")
            yield RichLog(id="log")

    def on_mount(self) -> None:
        """Fill what has to be filled."""
        table = self.query_one("#table", DataTable)
        table.add_columns("one", "two")
        table.add_rows([("1", "2"), ("3", "4")])
        self.query_one("#log", RichLog).write("logged")
        self.notify("a toast", severity="error")

    def get_line_filters(self) -> Sequence[LineFilter]:
        """As the console does in red."""
        sixteen = self._depth is ColorSystem.STANDARD
        return [*super().get_line_filters(), RedFilter(sixteen_colours=sixteen), CleanFilter()]


@pytest.mark.parametrize("depth", DEPTHS)
def test_every_cell_of_many_widgets_is_red(depth: ColorSystem) -> None:
    """No cell of any widget is told to have green or blue, and all text can be read."""

    async def look() -> list[Segment]:
        app = Gaudy(depth)
        async with app.run_test(size=(60, 50), notifications=True) as pilot:
            await pilot.pause()
            strips = app.screen._compositor.render_strips()
            return [segment for strip in strips for segment in strip]

    drawn = asyncio.run(look())
    text = "".join(segment.text for segment in drawn)
    for wanted in ("primary", "black on black", "lime on blue", "faint", "toast", "logged"):
        assert wanted in text
    for segment in drawn:
        assert segment.style is not None
        check(segment.style, depth)
