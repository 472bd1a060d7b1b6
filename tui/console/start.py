"""Starting the console on a terminal: tonight, on a logbook."""

from __future__ import annotations

import argparse
import logging
import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

import platformdirs

from engine.clock import Clock, SystemClock
from engine.errors import NoAnswer
from tui.console.app import Console
from tui.console.keys import load_keys
from tui.look.terminal import SteadyDriver

if TYPE_CHECKING:
    from engine.watch import Opened


def open_console(arguments: argparse.Namespace) -> int:
    """Open the console on tonight and keep it until the observer leaves; return 0."""
    need_a_terminal()
    folder: Path = arguments.logbook
    if not (folder / "observatory.toml").exists():
        from tui.first_use import offer_logbook

        if not offer_logbook(folder):
            return 1
    clock = SystemClock()
    observers = tuple(arguments.observer)
    console = Console(
        opener(folder, clock, observers),
        look=look_for(arguments.look),
        driver_class=SteadyDriver,
        notices_steps=True,
        keys=load_keys(),
    )
    return run_console(console)


def opener(folder: Path, clock: Clock, observers: tuple[str, ...]) -> Callable[[], Opened]:
    """Return what opens the night, to be called once the console has been painted."""

    def open_night() -> Opened:
        from engine.watch import open_watch

        return open_watch(folder, clock, observers)

    return open_night


def run_console(console: Console) -> int:
    """Run a console until it is left; what it could not open is raised here, outside of it."""
    trouble = platformdirs.user_log_path("warmroom", ensure_exists=True) / "trouble.log"
    logging.basicConfig(filename=trouble, level=logging.WARNING, format="%(asctime)s %(message)s")
    console.run(mouse=True)
    if console.failure is not None:
        raise console.failure
    if console.parting is not None:
        print(console.parting, file=sys.stderr)
    return console.return_code or 0


def need_a_terminal() -> None:
    """Refuse, in one line, to draw a console on what is no terminal.

    Textual draws on stderr and reads stdin: both must be one.
    """
    if not (sys.stdin.isatty() and sys.__stderr__ is not None and sys.__stderr__.isatty()):
        raise NoAnswer("the console needs a terminal on stdin and stderr; over ssh, use 'ssh -t'")


def look_for(asked: str) -> str:
    """Return the look to begin with: the one asked for, without colour where NO_COLOR is set."""
    return "mono" if asked == "night" and os.environ.get("NO_COLOR") else asked
