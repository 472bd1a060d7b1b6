"""The looks: what each role of text is drawn in. Nothing is told by colour alone.

A role says what a piece of text is, never what colour it has. ``red`` is for dark-adapted eyes: its
colours are made by a filter over everything that is drawn (`tui.look.filters`), so that no widget
can forget it.
"""

from __future__ import annotations

from dataclasses import dataclass

from rich.style import Style
from textual.theme import Theme

ROLES = (
    "text",     # ordinary
    "dim",      # labels, units, what matters less
    "strong",   # what matters most
    "title",    # headings
    "good",     # may be observed, on disk, done
    "warn",     # a caution
    "bad",      # a limit broken, a fault
    "now",      # the present moment, what is under way
    "accent",   # keys, the chosen target
    "moon",     # the Moon
    "sky",      # twilight
    "planned",  # a visit of the order
    "planned2", # the next one, so that neighbours can be told apart
    "lost",     # lost time
    "cursor",   # the line under the cursor
    "alarm",    # what must be seen at once, from edge to edge
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Look:
    """One look: its name, its background, and a style for each role."""

    name: str
    dark: bool
    background: str
    panel: str
    styles: dict[str, Style]

    def style(self, role: str) -> Style:
        """Return the style of a role; KeyError for an unknown one."""
        return self.styles[role]

    def theme(self) -> Theme:
        """Return the look as Textual's own widgets (palette, input, toast) take it."""
        colour = {
            role: style.color.name if style.color else None for role, style in self.styles.items()
        }
        return Theme(
            name=f"warmroom-{self.name}",
            primary=str(colour["accent"]),
            secondary=str(colour["moon"]),
            accent=str(colour["accent"]),
            foreground=str(colour["text"]),
            background=self.background,
            surface=self.background,
            panel=self.panel,
            warning=str(colour["warn"]),
            error=str(colour["bad"]),
            success=str(colour["good"]),
            dark=self.dark,
        )


def _look(name: str, dark: bool, background: str, panel: str, colours: dict[str, str]) -> Look:
    styles = {role: Style.parse(text) for role, text in colours.items()}
    assert set(styles) == set(ROLES), set(ROLES) ^ set(styles)
    return Look(name, dark, background, panel, styles)


_NIGHT = {
    "text": "#d3c9ba",
    "dim": "#8d8171",
    "strong": "bold #f2e8d8",
    "title": "bold #c79a5c",
    "good": "#a8b98a",
    "warn": "bold #e3b25e",
    "bad": "bold #df7f63",
    "now": "bold #f0c674",
    "accent": "bold #e0a85a",
    "moon": "#b5bfca",
    "sky": "#6f7f99",
    "planned": "#d9cbb4 on #3a3026",
    "planned2": "#d9cbb4 on #4d3f30",
    "lost": "#df7f63",
    "cursor": "bold #fff4e0 on #44361f",
    "alarm": "bold reverse #f0a080",
}

_DAY = {
    "text": "#2b2620",
    "dim": "#6d6459",
    "strong": "bold #000000",
    "title": "bold #7a4b0f",
    "good": "#3c5a1e",
    "warn": "bold #8a5a00",
    "bad": "bold #a3290c",
    "now": "bold #7a3e00",
    "accent": "bold #7a4b0f",
    "moon": "#3d5470",
    "sky": "#5a6c8c",
    "planned": "#2b2620 on #dccfb8",
    "planned2": "#2b2620 on #c9b898",
    "lost": "#a3290c",
    "cursor": "bold #000000 on #e6c98f",
    "alarm": "bold reverse #8f1f05",
}

LOOKS: dict[str, Look] = {
    look.name: look
    for look in (
        _look("night", True, "#161310", "#221d18", _NIGHT),
        _look("red", True, "#000000", "#000000", _NIGHT),
        _look("day", False, "#f4eee2", "#e8dfce", _DAY),
        _look("mono", True, "#000000", "#000000", _NIGHT),
    )
}
