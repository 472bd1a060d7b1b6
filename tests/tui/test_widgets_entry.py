"""The entry line: keys as they come, faults beside what was typed, a cursor always in sight."""

from __future__ import annotations

import asyncio
from collections.abc import Callable
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from rich.cells import cell_len
from textual.app import App, ComposeResult

from tui.widgets import Entry, Question
from tui.widgets.entry import CURSOR, LONGEST, in_sight

NAMES = {"⏎": "enter", "⎋": "escape", "⌫": "backspace", "←": "left", "→": "right"}


class Asking(App[None]):
    """An entry line alone."""

    def compose(self) -> ComposeResult:
        """Hold the entry."""
        yield Entry(id="entry")


def number(text: str) -> float:
    """Read a number, as the console's questions do."""
    try:
        return float(text)
    except ValueError:
        raise ValueError("expected a number") from None


def asked(
    typed: str, *, choices: tuple[tuple[str, str], ...] = (), width: int = 60
) -> tuple[list[Any], bool, str, str]:
    """Ask, type, and return the answers, whether it is still open, the text kept, and the line."""
    answers: list[Any] = []
    read: Callable[[str], Any] = str if choices else number

    async def run() -> tuple[bool, str, str]:
        app = Asking()
        async with app.run_test(size=(width, 4)) as pilot:
            entry = app.query_one(Entry)
            entry.ask(Question("seeing", read, answers.append, choices))
            await pilot.pause()
            for each in typed:
                name = NAMES.get(each)
                entry.take_key(name or each, None if name else each)
            return entry.is_open, entry.text, entry.render_line(0).text

    return answers, *asyncio.run(run())


def test_enter_answers_and_closes() -> None:
    """What was typed is read and handed on, once."""
    answers, is_open, _, _ = asked("1.4⏎")
    assert answers == [1.4]
    assert not is_open


def test_a_fault_stands_beside_what_was_typed() -> None:
    """Nothing typed is lost; the next key takes the fault away; mending it answers."""
    answers, is_open, text, line = asked("1.x⏎")
    assert (answers, is_open, text) == ([], True, "1.x")
    assert "1.x" + CURSOR in line
    assert line.rstrip().endswith("expected a number")
    assert "expected" not in asked("1.x⏎⌫")[3]
    assert asked("1.x⏎⌫4⏎")[0] == [1.4]


def test_escape_leaves_without_an_answer() -> None:
    """And what was typed is gone with the question."""
    answers, is_open, _, _ = asked("1.4⎋")
    assert answers == []
    assert not is_open


def test_the_cursor_moves_in_the_text() -> None:
    """A figure is put in, and one taken out, in the middle."""
    assert asked("12←.→⏎")[0] == [1.2]
    assert asked("1x2←⌫⏎")[0] == [12.0]
    assert asked("⌫←1⏎")[0] == [1.0]


@pytest.mark.parametrize(("typed", "expected"), [("y", ["y"]), ("x", []), ("⏎", []), ("xn", ["n"])])
def test_one_letter_chooses(typed: str, expected: list[str]) -> None:
    """Only an offered letter answers; another one is told what was expected."""
    answers, is_open, _, line = asked(typed, choices=(("y", "yes"), ("n", "no")))
    assert answers == expected
    assert is_open == (not expected)
    if not expected:
        assert "expected one of" in line


def test_what_cannot_be_printed_is_not_taken() -> None:
    """Escapes, controls, bidi and zero-width characters never get into the text."""
    assert asked("1\x1b\x07\u202e\u200b.\u2066\x9b4⏎")[0] == [1.4]


def test_pasted_text_is_taken_within_a_limit() -> None:
    """A pasted book is cut; the line still shows where it ends."""

    async def run() -> tuple[str, str]:
        app = Asking()
        async with app.run_test(size=(60, 4)) as pilot:
            entry = app.query_one(Entry)
            entry.ask(Question("note", str, lambda _: None))
            await pilot.pause()
            entry.take_text("ab\n" * LONGEST)
            return entry.text, entry.render_line(0).text

    text, line = asyncio.run(run())
    assert text == "ab" * (LONGEST // 2)
    assert "b" + CURSOR in line


@given(st.text("ab .星", max_size=60), st.integers(0, 60), st.integers(4, 30))
def test_the_cursor_is_always_in_sight(text: str, place: int, room: int) -> None:
    """However long the text and wherever the cursor: it shows, in the room there is."""
    at = min(place, len(text))
    shown = in_sight(text, at, room)
    before, cursor, after = shown.partition(CURSOR)
    assert cursor
    assert text[:at].endswith(before)
    assert text[at:].startswith(after)
    assert cell_len(shown) <= room
    if cell_len(text) < room:
        assert before + after == text
