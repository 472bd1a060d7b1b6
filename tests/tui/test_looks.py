"""The looks: red has no green or blue in any cell, everything can be read, text is always clean."""

from __future__ import annotations

from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.color import Color as RichColor
from rich.segment import Segment
from rich.style import Style
from textual.color import Color

from tests.tui.trial import Trial, a_logbook, play
from tui.console.views import VIEWS
from tui.look import LOOKS, ROLES, CleanFilter, MonoFilter, RedFilter
from tui.look.filters import DIMMEST_TEXT

BLACK = Color(0, 0, 0)
channels = st.integers(0, 255)
colours = st.tuples(channels, channels, channels)


def cells(trial: Trial) -> list[Segment]:
    """Return every segment the whole screen is made of, filters applied."""
    compositor = trial.console.screen._compositor
    return [segment for strip in compositor.render_strips() for segment in strip]


def red_only(style: Style | None) -> bool:
    """Say whether neither text nor ground has green or blue in it."""
    if style is None:
        return True
    for colour in (style.color, style.bgcolor):
        if colour is not None and not colour.is_default and any(colour.get_truecolor()[1:]):
            return False
    return True


@given(colours, colours)
def test_red_is_red_and_can_be_read(text: tuple[int, ...], ground: tuple[int, ...]) -> None:
    """Whatever a widget draws, what reaches the terminal is red, with a gap between the two."""
    style = Style(color=RichColor.from_rgb(*text), bgcolor=RichColor.from_rgb(*ground))
    ((_, made, _),) = RedFilter().apply([Segment("x", style)], BLACK)
    assert made is not None
    assert red_only(made)
    assert made.color is not None
    assert made.bgcolor is not None
    levels = made.color.get_truecolor()[0], made.bgcolor.get_truecolor()[0]
    assert abs(levels[0] - levels[1]) >= 80
    assert levels[0] >= DIMMEST_TEXT or levels[1] >= DIMMEST_TEXT


@given(colours, colours)
def test_red_with_sixteen_colours(text: tuple[int, ...], ground: tuple[int, ...]) -> None:
    """Only black and the two reds are used, never one on itself."""
    style = Style(color=RichColor.from_rgb(*text), bgcolor=RichColor.from_rgb(*ground))
    ((_, made, _),) = RedFilter(sixteen_colours=True).apply([Segment("x", style)], BLACK)
    assert made is not None
    assert made.color is not None
    assert made.bgcolor is not None
    assert {made.color.number, made.bgcolor.number} <= {0, 1, 9}
    assert made.color.number != made.bgcolor.number


@given(colours, colours)
def test_mono_has_no_colour(text: tuple[int, ...], ground: tuple[int, ...]) -> None:
    """No colour is left; what stood on a bright ground is reversed."""
    style = Style(color=RichColor.from_rgb(*text), bgcolor=RichColor.from_rgb(*ground))
    ((_, made, _),) = MonoFilter().apply([Segment("x", style)], BLACK)
    assert made is not None
    assert made.color is None
    assert made.bgcolor is None


@given(st.text())
def test_no_cell_holds_what_a_terminal_obeys(text: str) -> None:
    """Controls, C1, bidi and zero-width characters are gone; the rest stays."""
    ((made, _, _),) = CleanFilter().apply([Segment(text)], BLACK)
    assert not any(ord(each) < 32 or 127 <= ord(each) < 160 for each in made)
    assert not set(made) & set("\u200b\u200e\u200f\u202a\u202e\u2066\u2069\ufeff\u2028\u2029")
    kept = [each for each in text if each in made]
    assert [each for each in text if each.isascii() and each.isprintable()] == [
        each for each in kept if each.isascii() and each.isprintable()
    ]


def test_every_look_has_every_role() -> None:
    """A painter may use any role in any look."""
    for look in LOOKS.values():
        assert set(look.styles) == set(ROLES)


@pytest.mark.parametrize("size", [(80, 24), (160, 50)])
def test_every_view_and_panel_is_red_in_red(tmp_path: Path, size: tuple[int, int]) -> None:
    """Each view and panel, a caution, the entry, the help and the palette: no green, no blue."""

    async def story(trial: Trial) -> None:
        await trial.press("z")
        await trial.type("4.5")
        await trial.press("c", "w")
        await trial.type("40")
        await trial.press("space", "space", "space")
        await trial.wait(10.0)
        views = tuple((each.key,) for each in VIEWS)
        for keys in (
            *views, ("1",), ("tab",), ("tab",), ("tab",), ("tab",), ("z", "9", "9", "9", "enter"),
            ("escape", "question_mark"), ("escape", "ctrl+p"), ("escape",),
        ):  # fmt: skip
            await trial.pilot.press(*keys)
            await trial.pilot.pause()
            drawn = cells(trial)
            assert len(drawn) > 20
            assert all(red_only(segment.style) for segment in drawn), keys

    play(a_logbook(tmp_path / "nights"), story, size=size, look="red")


@pytest.mark.parametrize("size", [(80, 24), (160, 50)])
@pytest.mark.parametrize("look", LOOKS)
def test_everything_stands_out_from_its_ground(
    tmp_path: Path, look: str, size: tuple[int, int]
) -> None:
    """In every view and look each character that is drawn differs from the ground it is on."""

    async def story(trial: Trial) -> None:
        for entry in VIEWS:
            await trial.press(entry.key)
            for text, style, _ in cells(trial):
                if text.strip(" \n") and style is not None and style.color is not None:
                    ground = style.bgcolor
                    assert ground is None or contrast(style.color, ground) >= 2.2, (entry, text)

    play(a_logbook(tmp_path / "nights"), story, size=size, look=look)


def contrast(one: RichColor, other: RichColor) -> float:
    """Return the contrast of two colours, by the formula of WCAG 2.1."""
    lights = sorted(luminance(each) for each in (one, other))
    return (lights[1] + 0.05) / (lights[0] + 0.05)


def luminance(colour: RichColor) -> float:
    """Return the relative luminance of a colour (WCAG 2.1)."""
    parts = (
        value / 12.92 if value <= 0.03928 else ((value + 0.055) / 1.055) ** 2.4
        for value in (channel / 255.0 for channel in colour.get_truecolor())
    )
    return sum(weight * part for weight, part in zip((0.2126, 0.7152, 0.0722), parts, strict=True))


def test_looks_take_turns(tmp_path: Path) -> None:
    """V goes through all looks and back, each painted."""

    async def story(trial: Trial) -> None:
        seen = [trial.console.look]
        for _ in LOOKS:
            await trial.press("v")
            seen.append(trial.console.look)
            assert "Kestrel Ridge" in trial.text("head")
        assert seen[0] == seen[-1]
        assert set(seen) == set(LOOKS)

    play(a_logbook(tmp_path / "nights"), story)
