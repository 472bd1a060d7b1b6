"""The help: every key, from the one table of actions."""

from __future__ import annotations

from textual.app import ComposeResult
from textual.binding import Binding
from textual.containers import VerticalScroll
from textual.screen import ModalScreen

from tui.console.actions import GROUPS, cap
from tui.console.keys import Keys
from tui.look import Look
from tui.paint.spans import BLANK, Line, Span, line, wrapped
from tui.widgets import Sheet

MOVING = (
    ("↓ ↑ j k", "move the cursor"),
    ("PgDn PgUp g G", "by a screenful, to the ends"),
    ("esc", "put aside: an entry, a search, the notices"),
    ("ctrl+p", "every action by name"),
)
KEYS_WIDTH = 16


class HelpScreen(ModalScreen[None]):
    """Every key and what it does; any of escape, q, ? and F1 closes it."""

    CSS = """
    HelpScreen { background: $background; }
    HelpScreen Sheet { height: auto; }
    """
    BINDINGS = [  # noqa: RUF012 - Textual declares it so
        Binding("escape,q,question_mark,f1", "dismiss", show=False)
    ]

    def __init__(self, look: Look, keys: Keys) -> None:
        super().__init__()
        self._look = look
        self._keys = keys

    def compose(self) -> ComposeResult:
        """Make one long sheet that scrolls."""
        with VerticalScroll():
            yield Sheet(id="help")

    def on_mount(self) -> None:
        """Write the help for the width there is."""
        sheet = self.query_one("#help", Sheet)
        lines = help_lines(self._keys, self.app.size.width - 4)
        sheet.styles.height = len(lines)
        sheet.set_look(self._look)
        sheet.show(lines)


def help_lines(keys: Keys, width: int) -> list[Line]:
    """Return the help in lines of at most so many cells."""
    lines: list[Line] = [
        line(Span(" warmroom", "strong"), Span("  advises, and controls nothing", "dim")),
        *wrapped(
            "Where acting on it could harm a person or the instrument (the Sun, the weather, a "
            "moving dome, cold and dark), the observatory's own rules and its duty staff decide.",
            width,
            "dim",
            3,
            indent=1,
        ),
    ]
    for group in GROUPS:
        lines += [BLANK, line(Span(f" {group}", "title"))]
        for action in keys.actions:
            if action.group == group:
                lines += _entry(" ".join(cap(key) for key in action.keys), action.sentence, width)
    lines += [BLANK, line(Span(" moving about", "title"))]
    for moving, sentence in MOVING:
        lines += _entry(moving, sentence, width)
    return lines


def _entry(keys: str, sentence: str, width: int) -> list[Line]:
    text = wrapped(sentence, width - KEYS_WIDTH, "text", 3)
    first = (Span(f"  {keys:<{KEYS_WIDTH - 2}}", "accent"), *text[0])
    return [first, *((Span(" " * KEYS_WIDTH), *each) for each in text[1:])]
