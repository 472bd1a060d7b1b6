"""README tells what is there: its tables of keys and commands are those of the program."""

from __future__ import annotations

from pathlib import Path

from tui.commands import COMMANDS
from tui.console.actions import ACTIONS, cap

README = (Path(__file__).parents[2] / "README.md").read_text(encoding="utf-8")


def test_every_key_is_in_the_readme() -> None:
    """One row an action, with its keys and its sentence."""
    for action in ACTIONS:
        keys = ", ".join(cap(key) for key in action.keys)
        assert f"| {keys} | {action.sentence} |" in README


def test_every_command_is_in_the_readme() -> None:
    """One row a command."""
    for command in COMMANDS:
        assert f"| `warmroom {command.name}` | {command.help} |" in README


def test_the_two_commands_can_be_found_by_ci() -> None:
    """The lines that .ci/run looks for are there, once each."""
    lines = README.splitlines()
    for mark in ("# the demo", "# the tests"):
        assert lines.count(mark) == 1
        assert lines[lines.index(mark) + 1].startswith("python3 -m venv .venv && ")
