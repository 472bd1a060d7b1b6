"""A sheet: a widget that shows painted lines and repaints only those that changed.

The owner hands it lines; the sheet compares and asks for just the changed rows, since Textual sends
the whole of what is refreshed. Every panel of the console is one of these.
"""

from __future__ import annotations

from collections.abc import Sequence

from rich.segment import Segment
from rich.style import Style
from textual.events import Resize
from textual.geometry import Region
from textual.message import Message
from textual.strip import Strip
from textual.widget import Widget

from tui.look import LOOKS, Look
from tui.paint.spans import BLANK, Line


class Sheet(Widget):
    """Painted lines, one a row, from the top."""

    DEFAULT_CSS = """
    Sheet { height: auto; }
    """

    class Resized(Message):
        """The sheet has got another size, so what it shows may be of the wrong one."""

    def __init__(self, *, id: str | None = None, classes: str | None = None) -> None:
        super().__init__(id=id, classes=classes)
        self._lines: list[Line] = []
        self._look: Look = LOOKS["night"]

    def show(self, lines: Sequence[Line]) -> None:
        """Show these lines; rows that stay the same are not sent again."""
        before, self._lines = self._lines, list(lines)
        rows = max(len(before), len(self._lines))
        changed = [
            Region(0, row, self.size.width, 1)
            for row in range(min(rows, self.size.height))
            if _row(before, row) != _row(self._lines, row)
        ]
        if changed:
            self.refresh(*changed)

    def set_look(self, look: Look) -> None:
        """Draw with another look's styles."""
        self._look = look
        self.refresh()

    def on_resize(self, event: Resize) -> None:
        """Tell the owner, who knows what fits now."""
        self.post_message(self.Resized())

    def render_line(self, y: int) -> Strip:
        """Return one row: called by Textual for each row it wants."""
        return self.strip(_row(self._lines, y), self.size.width)

    def strip(self, spans: Line, width: int) -> Strip:
        """Return a painted line as a strip exactly so many cells wide."""
        ground = self.rich_style
        segments = [Segment(span.text, self._style(ground, span.role)) for span in spans]
        # Neighbours drawn alike go as one: half the bytes of a row are changes of style.
        return Strip(segments).simplify().adjust_cell_length(width, ground)

    def _style(self, ground: Style, role: str) -> Style:
        return ground + self._look.style(role)


def _row(lines: list[Line], row: int) -> Line:
    return lines[row] if row < len(lines) else BLANK
