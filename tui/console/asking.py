"""Asking in the entry line for something that is then done: the same for deeds and views."""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Any

from engine.logbook.text import one_line
from tui.widgets import Question

if TYPE_CHECKING:
    from tui.console.app import Console


def ask_and_do(
    console: Console,
    label: str,
    read: Callable[[str], Any],
    then: Callable[[Any], object],
    choices: tuple[tuple[str, str], ...] = (),
    text: str = "",
) -> None:
    """Ask, act on the answer, and show what that did, also when it could not be done."""

    def act(value: Any) -> None:
        try:
            then(value)
        finally:
            console.after_deed()

    console.ask(Question(label, read, act, choices, text))


def text_of(length: int, least: int = 0) -> Callable[[str], str]:
    """Return a reader of one line of text, cleaned, of so many characters."""

    def read(text: str) -> str:
        cleaned = one_line(text, length)
        if len(cleaned) < least:
            raise ValueError("expected some text; escape leaves")
        return cleaned

    return read
