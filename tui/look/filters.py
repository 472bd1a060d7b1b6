"""Last filters over everything drawn: clean text always, red or no colour in those looks.

They see every cell of every widget, toasts and command palette included, so a look can't leak.
"""

from __future__ import annotations

import re
from functools import lru_cache

from rich.color import Color as RichColor
from rich.color_triplet import ColorTriplet
from rich.segment import Segment
from rich.style import Style
from textual.color import Color
from textual.filter import LineFilter

# The reds that a palette of 256 has exactly, so that nothing is rounded into another hue.
RED_LEVELS = (0, 95, 135, 175, 215, 255)
# The least step between a red text and a red ground on which it stands.
LEAST_GAP = 120
# A contrast of 2.8 to 1 on black (WCAG 2.1's formula): red has no more to give than 5.3 to 1.
DIMMEST_TEXT = 175

_CONTROLS = re.compile(
    "[\x00-\x1f\x7f-\x9f\u00ad\u061c\u180e\u200b-\u200f\u2028-\u202f\u2060-\u206f\ufeff\ufff9-\ufffb]"
)
_BLACK, _RED, _BRIGHT_RED = (RichColor.from_ansi(number) for number in (0, 1, 9))


class CleanFilter(LineFilter):
    """Takes out of every cell what a terminal could obey: the last guard, after all others."""

    def apply(self, segments: list[Segment], background: Color) -> list[Segment]:
        """Return the segments without control, format and invisible characters."""
        return [
            Segment(_CONTROLS.sub("", text), style, control)
            if not control and _CONTROLS.search(text)
            else Segment(text, style, control)
            for text, style, control in segments
        ]


class RedFilter(LineFilter):
    """Draws everything in red on black, by brightness; with 16 colours in its two reds."""

    def __init__(self, sixteen_colours: bool = False) -> None:
        super().__init__()
        self._style = _red_of_sixteen if sixteen_colours else _red

    def apply(self, segments: list[Segment], background: Color) -> list[Segment]:
        """Return the segments in red."""
        return [
            Segment(text, self._style(style or Style.null()), control)
            for text, style, control in segments
        ]


class MonoFilter(LineFilter):
    """Takes all colour away; what stood on a ground of its own is reversed instead."""

    def apply(self, segments: list[Segment], background: Color) -> list[Segment]:
        """Return the segments without colour."""
        return [
            Segment(text, _mono(style or Style.null()), control)
            for text, style, control in segments
        ]


def _brightness(colour: RichColor | None, otherwise: float) -> float:
    """Return how bright a colour looks, 0 to 255 (Rec. 709 weights, ITU-R BT.709)."""
    if colour is None or colour.is_default:
        return otherwise
    red, green, blue = colour.get_truecolor()
    return max(0.2126 * red + 0.7152 * green + 0.0722 * blue, red * 0.6)


def _levels(style: Style) -> tuple[int, int]:
    """Return the red levels of text and ground, far enough apart to be read."""
    ground = _nearest(_brightness(style.bgcolor, 0.0) * 0.9)
    text = max(_nearest(_brightness(style.color, 190.0) * 1.05), DIMMEST_TEXT)
    if abs(text - ground) < LEAST_GAP:
        text = 255 if ground <= 135 else 0
    return text, ground


def _nearest(value: float) -> int:
    return min(RED_LEVELS, key=lambda level: abs(level - value))


@lru_cache(4096)
def _red(style: Style) -> Style:
    text, ground = _levels(style)
    return style + Style(
        color=RichColor.from_triplet(ColorTriplet(text, 0, 0)),
        bgcolor=RichColor.from_triplet(ColorTriplet(ground, 0, 0)),
        # A terminal's own way to draw faint text would take the contrast away again.
        dim=False,
    )


@lru_cache(4096)
def _red_of_sixteen(style: Style) -> Style:
    text, _ = _levels(style)
    # A terminal has one red, one bright red and black, and some make the first so dark that black
    # on it can't be read: a ground is bright red or nothing. It is kept for what stands out by its
    # weight too (the cursor): a wide field of it would be too bright for eyes used to the dark.
    ground = _brightness(style.bgcolor, 0.0)
    if ground > (40.0 if style.bold else 100.0):
        return style + Style(color=_BLACK, bgcolor=_BRIGHT_RED, dim=False)
    return style + Style(color=_BRIGHT_RED if text >= 175 else _RED, bgcolor=_BLACK, dim=False)


@lru_cache(4096)
def _mono(style: Style) -> Style:
    on_ground = _brightness(style.bgcolor, 0.0) > 40.0
    return Style(
        bold=style.bold,
        italic=style.italic,
        underline=style.underline,
        reverse=bool(style.reverse) != on_ground,
    )
