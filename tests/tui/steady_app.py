"""A small app on `SteadyDriver`, for tests to stall, hang up and signal: run as a module.

It counts on screen and into a file, and writes there why it was told to leave.
"""

from __future__ import annotations

import signal
import sys
from pathlib import Path

from rich.text import Text
from textual.app import App, ComposeResult
from textual.widgets import Static

from tui.look.terminal import MustLeave, SteadyDriver

TICK_S = 0.02
# The count at which the first line changes, for the one and only time.
ONCE = 120


class Steady(App[None]):
    """Fills its screen with its count, as fast as a slow terminal can't follow."""

    def __init__(self, told: Path) -> None:
        super().__init__(driver_class=SteadyDriver)
        self._told = told
        self._count = 0

    def compose(self) -> ComposeResult:
        """Show a line that changes once, above one that fills the rest of the screen."""
        yield Static(id="once")
        yield Static(id="all")

    def on_mount(self) -> None:
        """Start to count."""
        self.set_interval(TICK_S, self._tick)

    def on_must_leave(self, event: MustLeave) -> None:
        """Leave as told."""
        self._tell(f"leave {event.status} {event.why}")
        self.exit(return_code=event.status)

    def _tick(self) -> None:
        self._count += 1
        self._tell(f"count {self._count}")
        if self._count == ONCE:
            self.query_one("#once", Static).update(Text(f"past {ONCE}"))
        words = f"count {self._count}; " * (self.size.width * self.size.height // 14)
        self.query_one("#all", Static).update(Text(words))

    def _tell(self, line: str) -> None:
        with self._told.open("a", encoding="utf-8") as file:
            file.write(line + "\n")


if __name__ == "__main__":
    if "deaf" in sys.argv[2:]:
        signal.signal(signal.SIGHUP, signal.SIG_IGN)
    app = Steady(Path(sys.argv[1]))
    app.run()
    sys.exit(app.return_code)
