"""First use: where there is no logbook yet, six questions on a plain terminal write one."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from engine.errors import LogbookFaults
from engine.first_logbook import QUESTIONS, Question, first_logbook, write_first_logbook

INTRODUCTION = """\
{folder} has no observatory.toml yet, so there is no logbook to open.
Six answers write a first one, commented, to be put right later; enter takes the example
in brackets, ctrl+c leaves without writing anything. To see a night first: warmroom demo
"""


def offer_logbook(folder: Path) -> bool:
    """Ask the six questions and write a logbook; return whether there is one now."""
    print(INTRODUCTION.format(folder=folder))
    typed = ["" for _ in QUESTIONS]
    try:
        while True:
            answers = [_answer(place, question, typed) for place, question in enumerate(QUESTIONS)]
            try:
                write_first_logbook(folder, first_logbook(answers))
            except LogbookFaults as error:
                # Each answer was sound; together they are not. What was typed is there again.
                print("\nTogether these do not fit; look at them once more:")
                for fault in error.faults:
                    print(f"  {fault.key}: {fault.what}")
                continue
            break
    except (KeyboardInterrupt, EOFError):
        print("\nNothing was written.")
        return False
    print(f"\n{folder / 'observatory.toml'} and {folder / 'targets.toml'} are written.")
    print("What nobody was asked is marked 'a guess' in them; `warmroom check` reads them again.\n")
    return True


def _answer(place: int, question: Question, typed: list[str]) -> dict[str, Any]:
    """Ask one question until its answer can be read; what was typed is there to be mended."""
    while True:
        print(f"{place + 1}. {question.asks}")
        with _prefilled(typed[place]):
            text = input(f"   [{question.example}] ").strip() or question.example
        typed[place] = text
        try:
            return question.read(text)
        except ValueError as error:
            print(f"   {error}")


@contextmanager
def _prefilled(text: str) -> Iterator[None]:
    """Let the line to be typed begin with a text, where the terminal can do that."""
    try:
        import readline
    except ImportError:
        if text:
            print(f"   before: {text}")
        yield
        return
    readline.set_startup_hook(lambda: readline.insert_text(text))
    try:
        yield
    finally:
        readline.set_startup_hook()
