"""The entry line: a question, what is typed, and what is wrong with it, all in one row."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from textual.app import ComposeResult
from textual.containers import Horizontal
from textual.events import Key
from textual.message import Message
from textual.widgets import Input

from tui.paint.spans import Span, line
from tui.widgets.sheet import Sheet


@dataclass(frozen=True, slots=True)
class Question:
    """What is asked: a label, how to read the answer, and what to do with it.

    ``read`` returns the value or raises ValueError with what was expected. With ``choices`` (letter
    and word) one key answers.
    """

    label: str
    read: Callable[[str], Any]
    then: Callable[[Any], None]
    choices: tuple[tuple[str, str], ...] = ()


class Entry(Horizontal):
    """Asks one question at a time; hidden when there is none."""

    DEFAULT_CSS = """
    Entry { height: 1; display: none; }
    Entry > Sheet { height: 1; width: auto; }
    Entry > Input { height: 1; width: 1fr; border: none; padding: 0; min-width: 10; }
    """

    class Closed(Message):
        """The question was answered or put aside."""

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self._question: Question | None = None

    def compose(self) -> ComposeResult:
        """Make the label, the field, and the place for what is wrong."""
        yield Sheet(id="entry-label")
        field = Input(id="entry-field")
        field.cursor_blink = False
        yield field
        yield Sheet(id="entry-fault")

    @property
    def is_open(self) -> bool:
        """Whether a question is being asked."""
        return self._question is not None

    def ask(self, question: Question) -> None:
        """Ask a question; the field is empty and has the keyboard."""
        self._question = question
        words = "  ".join(f"{letter} {word}" for letter, word in question.choices)
        label = f" {question.label}: " + (f"{words} " if words else "")
        self._say("#entry-label", label, "accent")
        self._say("#entry-fault", "", "bad")
        field = self.query_one(Input)
        field.value = ""
        self.display = True
        field.focus()

    def close(self) -> None:
        """Put the question aside."""
        self._question = None
        self.display = False
        self.post_message(self.Closed())

    def on_key(self, event: Key) -> None:
        """Escape puts aside; a letter answers a question with choices."""
        question = self._question
        if question is None:
            return
        if event.key == "escape":
            event.stop()
            event.prevent_default()
            self.close()

    def on_input_changed(self, event: Input.Changed) -> None:
        """A letter that is a choice answers at once."""
        question = self._question
        event.stop()
        if question is not None and question.choices:
            letters = [letter for letter, _ in question.choices]
            if event.value in letters:
                self._answer(question, event.value)
            elif event.value:
                self.query_one(Input).value = ""
                self._say("#entry-fault", f" one of {' '.join(letters)} ", "bad")

    def on_input_submitted(self, event: Input.Submitted) -> None:
        """Enter answers; what can't be read stays in the field, with the reason beside it."""
        event.stop()
        if self._question is not None:
            self._answer(self._question, event.value)

    def _answer(self, question: Question, text: str) -> None:
        try:
            value = question.read(text)
        except ValueError as fault:
            self._say("#entry-fault", f" {fault} ", "bad")
            return
        self.close()
        question.then(value)

    def _say(self, where: str, text: str, role: str) -> None:
        sheet = self.query_one(where, Sheet)
        sheet.styles.width = len(text)
        sheet.show([line(Span(text, role))])
        sheet.refresh(layout=True)
