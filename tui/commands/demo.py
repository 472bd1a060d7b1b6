"""``warmroom demo``: an invented night through the very same engine, log and console."""

from __future__ import annotations

import argparse
import tempfile
from collections.abc import Callable
from contextlib import ExitStack
from pathlib import Path
from typing import TYPE_CHECKING

from engine.clock import PacedClock

if TYPE_CHECKING:
    from engine.log import NightState
    from engine.rehearsal import Rehearsal
    from engine.watch import Opened


def run(arguments: argparse.Namespace) -> int:
    """Play the night in the console, or unwatched; return the exit status."""
    with ExitStack() as stack:
        folder = arguments.into or Path(
            stack.enter_context(tempfile.TemporaryDirectory(prefix="warmroom-demo-"))
        )
        return _unwatched(arguments, folder) if arguments.unwatched else _console(arguments, folder)


def _rehearsal(arguments: argparse.Namespace, folder: Path) -> Rehearsal:
    from engine.rehearsal import NIGHT, prepare

    return prepare(folder, arguments.night or NIGHT, arguments.seed)


def _unwatched(arguments: argparse.Namespace, folder: Path) -> int:
    from engine.rehearsal import play_unwatched

    rehearsal = _rehearsal(arguments, folder)
    watch = play_unwatched(rehearsal)
    print("\n".join(_told(watch.state, rehearsal)))
    return 0


def _told(state: NightState, rehearsal: Rehearsal) -> list[str]:
    """Return what came of a night, in a few lines."""
    from engine.seeing import SeeingMeasurement, summary

    open_s = sum(each.exposed_s for each in state.exposures)
    lost_h = sum((e.end_mjd - e.begin_mjd) * 24.0 for e in state.lost if e.end_mjd is not None)
    targets = {each.target for each in state.kept}
    seeing = summary([SeeingMeasurement(each.mjd, each.zenith_arcsec) for each in state.seeing])
    seen = (
        f"seeing {seeing.best_arcsec:.2f} to {seeing.worst_arcsec:.2f} arcsec, "
        f"median {seeing.median_arcsec:.2f}, from {seeing.count} measurements"
        if seeing
        else "the seeing was never measured"
    )
    return [
        f"night of {rehearsal.night.isoformat()}, played from dusk to dawn",
        f"{len(state.events)} entries in the log, {len(state.exposures)} exposures, "
        f"{len(state.kept)} of them good, on {len(targets)} targets",
        f"shutter open {open_s / 3600.0:.1f} h, lost {lost_h:.1f} h; {seen}",
    ]


def _console(arguments: argparse.Namespace, folder: Path) -> int:
    from tui.console.app import Console
    from tui.console.clockwork import Autopilot
    from tui.console.keys import load_keys
    from tui.console.lesson import Lesson
    from tui.console.start import look_for, need_a_terminal, run_console
    from tui.look.terminal import SteadyDriver

    need_a_terminal()
    keys = load_keys()
    autopilot = _Onlooker() if not arguments.drive else None
    opener: Callable[[], Opened] = lambda: _open(arguments, folder, autopilot)  # noqa: E731
    pilot: Autopilot = autopilot or Lesson(keys)
    console = Console(
        opener,
        keys=keys,
        look=look_for(arguments.look),
        autopilot=pilot,
        driver_class=SteadyDriver,
    )
    return run_console(console)


class _Onlooker:
    """Passes ticks on to the player once the night is open."""

    def __init__(self) -> None:
        self.rehearsal: Rehearsal | None = None

    def tick(self, watch: object) -> tuple[str, ...]:
        """Let the player act."""
        from engine.watch import Watch

        if self.rehearsal is None or not isinstance(watch, Watch):
            return ()
        return self.rehearsal.player.tick(watch)


def _open(arguments: argparse.Namespace, folder: Path, onlooker: _Onlooker | None) -> Opened:
    from engine.rehearsal import OBSERVER, resume_mjd
    from engine.watch import open_watch

    rehearsal = _rehearsal(arguments, folder)
    if onlooker is not None:
        onlooker.rehearsal = rehearsal
    clock = PacedClock(resume_mjd(rehearsal), arguments.pace)
    return open_watch(rehearsal.folder, clock, (OBSERVER,), rehearsal.night)
