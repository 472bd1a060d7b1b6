"""``warmroom follow``: a night someone else is running, in the same console, read-only."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING

from engine.times import iso_from_mjd
from tui.commands.output import print_json

if TYPE_CHECKING:
    from engine.watch import Opened


def run(arguments: argparse.Namespace) -> int:
    """Open the console on a night to look on, or print where it stands as JSON."""
    if arguments.json:
        return _print_json(arguments)
    from tui.console.app import Console
    from tui.console.keys import load_keys
    from tui.console.start import look_for, need_a_terminal, run_console
    from tui.look.terminal import SteadyDriver

    need_a_terminal()
    console = Console(
        lambda: _open(arguments),
        keys=load_keys(),
        look=look_for(arguments.look),
        driver_class=SteadyDriver,
    )
    return run_console(console)


def _open(arguments: argparse.Namespace) -> Opened:
    from engine.watch.onlooker import open_onlooker

    return open_onlooker(arguments.logbook, arguments.night)


def _print_json(arguments: argparse.Namespace) -> int:
    opened = _open(arguments)
    watch, state = opened.watch, opened.watch.state
    last = state.events[-1] if state.events else None
    print_json(
        {
            "night": watch.planner.night.almanac.night.isoformat(),
            "entries": len(state.events),
            "last_entry": None if last is None else iso_from_mjd(last.t_mjd),
            "stage": watch.stage.value,
            "target": state.pointing.target if state.pointing else None,
            "exposures": len(state.exposures),
            "good": len(state.kept),
            "seeing_arcsec": state.seeing[-1].zenith_arcsec if state.seeing else None,
            "closed": state.closed,
        }
    )
    return 0
