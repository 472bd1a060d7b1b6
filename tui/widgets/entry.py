"""The entry line: a question, what is typed, and what is wrong with it, all in one row.

It is given keys one by one, in the order in which they were typed, and does each at once: on a slow
link keys come in bursts, and what follows a question must never be taken for a command.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from rich.cells import cell_len

from tui.paint.spans import Line, Span, fitted, spread
from tui.widgets.sheet import Sheet

CURSOR = "▏"
LONGEST = 10_000
# So much of what was typed stays in sight beside a fault.
LEAST_SEEN = 24


@dataclass(frozen=True, slots=True)
class Question:
    """What is asked: a label, how to read the answer, and what to do with it.

    ``read`` returns the value or raises ValueError with what was expected. With ``choices`` (letter
    and word) one key answers. ``text`` stands there at first, to be changed.
    """

    label: str
    read: Callable[[str], Any]
    then: Callable[[Any], None]
    choices: tuple[tuple[str, str], ...] = ()
    text: str = ""


class Entry(Sheet):
    """Asks one question at a time; hidden when there is none."""

    DEFAULT_CSS = """
    Entry { height: 1; display: none; }
    """

    def __init__(self, *, id: str | None = None) -> None:
        super().__init__(id=id)
        self._question: Question | None = None
        self._text = ""
        self._at = 0
        self._fault = ""

    @property
    def is_open(self) -> bool:
        """Whether a question is being asked."""
        return self._question is not None

    @property
    def text(self) -> str:
        """What has been typed so far."""
        return self._text

    def ask(self, question: Question) -> None:
        """Ask a question; what is typed from now on answers it."""
        self._question = question
        self._text, self._at, self._fault = question.text, len(question.text), ""
        self.display = True
        self._paint()

    def close(self) -> None:
        """Put the question aside."""
        self._question = None
        self.display = False

    def take_key(self, key: str, character: str | None) -> None:
        """Take one key: its name, and the character it types if it types one."""
        question = self._question
        if question is None:
            return
        self._fault = ""
        if key == "escape":
            self.close()
        elif key == "enter":
            self._answer(question, self._text)
        elif character is not None and character.isprintable():
            if question.choices:
                self._choose(question, character)
            else:
                self.take_text(character)
        else:
            self._edit(key)
        self._paint()

    def take_text(self, text: str) -> None:
        """Take text that was typed or pasted, at the cursor."""
        kept = "".join(each for each in text if each.isprintable())
        room = LONGEST - len(self._text)
        self._text = self._text[: self._at] + kept[:room] + self._text[self._at :]
        self._at += len(kept[:room])
        self._paint()

    def _edit(self, key: str) -> None:
        match key:
            case "backspace" | "ctrl+h" if self._at:
                self._text = self._text[: self._at - 1] + self._text[self._at :]
                self._at -= 1
            case "delete":
                self._text = self._text[: self._at] + self._text[self._at + 1 :]
            case "left":
                self._at = max(self._at - 1, 0)
            case "right":
                self._at = min(self._at + 1, len(self._text))
            case "home" | "ctrl+a":
                self._at = 0
            case "end" | "ctrl+e":
                self._at = len(self._text)
            case "ctrl+u":
                self._text, self._at = self._text[self._at :], 0

    def _choose(self, question: Question, letter: str) -> None:
        letters = [each for each, _ in question.choices]
        if letter in letters:
            self._answer(question, letter)
        else:
            self._fault = f"expected one of {' '.join(letters)}"

    def _answer(self, question: Question, text: str) -> None:
        if question.choices and text not in [letter for letter, _ in question.choices]:
            self._fault = "expected one of the letters; escape leaves"
            return
        try:
            value = question.read(text)
        except ValueError as fault:
            self._fault = str(fault)
            return
        self.close()
        question.then(value)

    def _paint(self) -> None:
        question = self._question
        if question is None:
            return
        choices = tuple(
            Span(part, role)
            for letter, word in question.choices
            for part, role in ((f"{letter} ", "accent"), (f"{word}  ", "text"))
        )
        room = max(self.app.size.width - len(question.label) - len(self._fault) - 6, LEAST_SEEN)
        answer = choices or (Span(in_sight(self._text, self._at, room), "strong"),)
        # What was typed and what is wrong with it matter more than what was asked.
        typed = min(cell_len(self._text) + len(CURSOR), LEAST_SEEN) if not choices else 0
        most = max(self.app.size.width - cell_len(self._fault) - typed - 6, 8)
        label = question.label if cell_len(question.label) <= most else fitted(question.label, most)
        left: Line = (Span(f" {label}: ", "accent"), *answer)
        self.show([spread(left, (Span(f"{self._fault} ", "bad"),), self.app.size.width)])


def in_sight(text: str, at: int, room: int) -> str:
    """Return typed text with its cursor, or the part around the cursor that has room (cells)."""
    begin = at
    while begin > 0 and cell_len(text[begin - 1 : at]) < room:
        begin -= 1
    shown = text[begin:at] + CURSOR
    for each in text[at:]:
        if cell_len(shown + each) > room:
            break
        shown += each
    return shown
