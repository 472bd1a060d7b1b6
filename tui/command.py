"""The command line: ``warmroom`` alone opens tonight's console, the rest print and end.

Exit status: 0 done, 1 the answer is no, 2 a fault in the input. Nothing here imports the engine
or Textual before a command needs it.
"""

from __future__ import annotations

import argparse
import importlib
import os
import sys
from collections.abc import Callable, Sequence
from importlib.metadata import version
from io import TextIOWrapper
from pathlib import Path
from typing import TypeVar

from engine.errors import WarmroomError
from tui import reading
from tui.commands import COMMANDS, LOOK, Command, Option

T = TypeVar("T")


def main(words: Sequence[str] | None = None) -> int:
    """Run warmroom with these words (the process's own when None); return the exit status."""
    for stream in (sys.stdout, sys.stderr):
        if isinstance(stream, TextIOWrapper):
            # A terminal without Unicode shows an escape where it has no character.
            stream.reconfigure(errors="backslashreplace")
    arguments = _parser().parse_args(words)
    try:
        module = importlib.import_module(arguments.module)
        status: int = module.run(arguments)
        sys.stdout.flush()
    except WarmroomError as error:
        print(error, file=sys.stderr)
        return error.exit_status
    except BrokenPipeError:
        # The reader (a pager, `head`) has gone; what was asked for is no longer wanted.
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except KeyboardInterrupt:
        return 130
    return status


def _parser() -> argparse.ArgumentParser:
    parser = argparse.ArgumentParser(
        prog="warmroom",
        description="Decide what to point at next, in which filter, and log the night.",
        epilog="Without a command, opens the console on tonight.",
        allow_abbrev=False,
    )
    parser.add_argument("--version", action="version", version=f"warmroom {version('warmroom')}")
    _add_logbook(parser, default=Path("nights"))
    parser.add_argument(
        "--observer", action="append", default=[], help="who is observing; may be repeated"
    )
    _add_option(parser, LOOK)
    parser.set_defaults(module="tui.console")
    below = parser.add_subparsers(title="commands", metavar="")
    for command in COMMANDS:
        _add_command(below.add_parser(command.name, help=command.help, allow_abbrev=False), command)
    return parser


def _add_command(parser: argparse.ArgumentParser, command: Command) -> None:
    parser.description = f"{command.help[0].upper()}{command.help[1:]}."
    parser.set_defaults(module=command.module)
    _add_logbook(parser, default=argparse.SUPPRESS)
    if command.takes_json:
        parser.add_argument("--json", action="store_true", help="print JSON, for scripts")
    if command.takes_moment:
        parser.add_argument(
            "--at",
            type=_checked(reading.moment),
            metavar="TIME",
            help="the moment, UTC (now)",
        )
    if command.takes_night:
        parser.add_argument(
            "--night",
            type=_checked(reading.night),
            metavar="DATE",
            help="the night, by the local date of its evening (tonight)",
        )
    for option in command.options:
        _add_option(parser, option)


def _add_option(parser: argparse.ArgumentParser, option: Option) -> None:
    settings = dict(option.settings)
    if option.read is not None:
        settings["type"] = _checked(option.read)
    parser.add_argument(option.flag, help=option.help, **settings)


def _add_logbook(parser: argparse.ArgumentParser, default: object) -> None:
    parser.add_argument(
        "--logbook", type=Path, default=default, metavar="DIR", help="the logbook (nights)"
    )


def _checked(read: Callable[[str], T]) -> Callable[[str], T]:
    """Return a reader whose ValueError, which says what was expected, argparse passes on."""

    def reader(text: str) -> T:
        try:
            return read(text)
        except ValueError as error:
            raise argparse.ArgumentTypeError(f"{text!r}, {error}") from None

    return reader


if __name__ == "__main__":
    sys.exit(main())
