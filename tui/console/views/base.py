"""What a view is: a painter of the place under the state of the night, and what keys do in it."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from engine.watch import Watch
from tui.console.asking import ask_and_do
from tui.paint.spans import Line

if TYPE_CHECKING:
    from tui.console.app import Console


class View:
    """A view of the night. It may keep where it stands (a cursor, a search), never the record.

    The target under the cursor is the console's (`Console.chosen`), the same in every view.
    """

    def __init__(self, console: Console, watch: Watch) -> None:
        self.console = console
        self.watch = watch

    def paint(self, width: int, height: int) -> list[Line]:
        """Return what to show in at most so many rows of so many cells."""
        raise NotImplementedError

    @property
    def hints(self) -> tuple[tuple[str, str], ...]:
        """The keys that are this view's own, for the foot: what is on the key, and a word."""
        return ()

    def take_action(self, name: str) -> bool:
        """Do an action of the table in this view's own way; return whether it was done."""
        return False

    def take_key(self, key: str, character: str | None) -> bool:
        """Take a key that is in no table; return whether it was for this view."""
        return False

    def ask(
        self,
        label: str,
        read: Callable[[str], Any],
        then: Callable[[Any], object],
        choices: tuple[tuple[str, str], ...] = (),
        text: str = "",
    ) -> None:
        """Ask in the entry line, act on the answer, and show what that did."""
        ask_and_do(self.console, label, read, then, choices, text)

    def move(self, by: int, unit: str) -> bool:
        """Move this view's own cursor as `LiveList.move`; False to move the console's."""
        return False
