"""The commands: one registry that the parser, the help and the tests read.

A command's module is imported only when it is asked for, so that each starts as quickly as its own
work allows. It has one function, ``run(arguments) -> int``, that returns the exit status.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from tui.reading import night, number_between, whole_number


@dataclass(frozen=True, slots=True)
class Option:
    """One option of one command: its settings as argparse takes them, and how its text is read."""

    flag: str
    help: str
    settings: dict[str, Any] = field(default_factory=dict)
    read: Callable[[str], Any] | None = None


@dataclass(frozen=True, slots=True)
class Command:
    """One printing command."""

    name: str
    help: str
    takes_moment: bool = False
    takes_night: bool = False
    takes_json: bool = True
    options: tuple[Option, ...] = ()

    @property
    def module(self) -> str:
        """The module that runs it."""
        return f"tui.commands.{self.name}"


SEEING = Option(
    "--seeing", "zenith seeing, arcsec at 500 nm", read=number_between(0.1, 20.0, "arcsec")
)

# The console's looks by name; `tui.look` holds them, but brings Textual along.
LOOK = Option(
    "--look",
    "the console's colours",
    {"choices": ("night", "red", "day", "mono"), "default": "night"},
)

COMMANDS: tuple[Command, ...] = (
    Command(
        "demo",
        "play an invented night on a copy of the sample logbook",
        takes_night=True,
        takes_json=False,
        options=(
            Option(
                "--pace",
                "seconds of the night in one second",
                {"default": 60.0},
                number_between(0.1, 3600.0, "seconds"),
            ),
            Option("--drive", "decide yourself instead of watching", {"action": "store_true"}),
            Option(
                "--unwatched",
                "play the whole night at once, without the console",
                {"action": "store_true"},
            ),
            Option(
                "--into",
                "play in this folder and keep it (a temporary one)",
                {"type": Path, "metavar": "DIR"},
            ),
            LOOK,
            Option("--seed", "which invented weather", {"default": 7}, whole_number),
        ),
    ),
    Command(
        "follow",
        "look on, read-only, at a night someone else is running",
        takes_night=True,
        options=(LOOK,),
    ),
    Command(
        "check",
        "print every fault in the logbook, or what it holds",
        takes_night=True,
        options=(
            Option("--keys", "print every key that its files may have", {"action": "store_true"}),
        ),
    ),
    Command("keys", "print every key of the console, and where to change it"),
    Command(
        "almanac",
        "print the night's Sun, twilight and Moon times",
        takes_night=True,
        options=(Option("--doubt", "set astroplan's times beside ours", {"action": "store_true"}),),
    ),
    Command(
        "sky",
        "print every target at one moment: where, how soft, may it be observed",
        takes_moment=True,
        options=(SEEING,),
    ),
    Command(
        "exposure",
        "print what an exposure of one target reaches: signal, depth, saturation",
        takes_moment=True,
        options=(
            Option("--target", "the target's name", {"required": True, "metavar": "NAME"}),
            Option("--filter", "one filter of its plan (all of them)", {"metavar": "NAME"}),
            Option(
                "--seconds",
                "length of an exposure (the plan's)",
                read=number_between(0.001, 86400.0, "seconds"),
            ),
            Option(
                "--magnitude",
                "of the star (the target's)",
                read=number_between(-30.0, 40.0, ""),
            ),
            SEEING,
        ),
    ),
    Command(
        "order",
        "print the proposed order for the rest of the night",
        takes_moment=True,
        takes_night=True,
        options=(
            SEEING,
            Option(
                "--bound",
                "prove an upper limit to any order's worth too (needs the extra 'bound')",
                {"action": "store_true"},
            ),
        ),
    ),
    Command(
        "report",
        "print one past night: what was done, how good it was, where the time went",
        takes_night=True,
        options=(
            Option(
                "--save",
                "write it into a new file instead; the ending says how: .md .html .json for the "
                "report, .csv .ecsv .vot for its exposures; may be repeated",
                {"type": Path, "metavar": "FILE", "action": "append", "default": []},
            ),
        ),
    ),
    Command(
        "past",
        "print past nights: what was done, how good it was, what remains",
        options=(
            Option("--since", "from this night on", {"metavar": "DATE"}, read=night),
            Option("--until", "up to this night", {"metavar": "DATE"}, read=night),
            Option("--target", "every exposure of one target", {"metavar": "NAME"}),
            Option("--find", "notes and reasons that hold all these words", {"metavar": "TEXT"}),
            Option(
                "--where",
                "exposures within a limit such as 'airmass<1.5'; may be repeated",
                {"metavar": "LIMIT", "action": "append", "default": []},
            ),
            Option("--filter", "exposures through one filter", {"metavar": "NAME"}),
            Option("--refused", "exposures that do not count, and why", {"action": "store_true"}),
            Option("--seeing", "the site's seeing, in full", {"action": "store_true"}),
            Option(
                "--fit",
                "measured against predicted image size; new values for observatory.toml",
                {"action": "store_true"},
            ),
            Option("--afresh", "read every log again", {"action": "store_true"}),
        ),
    ),
)
