"""Opening a night: the folder, the log, the tables, all in one place for console and rehearsal."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from importlib.metadata import version
from pathlib import Path

from engine.clock import Clock
from engine.errors import Fault
from engine.log import Event, Header, LogWorker, NightLog, TargetAdded, fold
from engine.logbook import Logbook, load_logbook
from engine.night import Taken
from engine.past import done_before
from engine.times import night_of
from engine.watch.listing import listed
from engine.watch.planning import Planner
from engine.watch.watch import Watch


@dataclass(frozen=True, slots=True)
class Opened:
    """A night that was opened: the watch over it, and what was not right about its log."""

    watch: Watch
    path: Path
    findings: tuple[Fault, ...]


def open_watch(
    folder: Path,
    clock: Clock,
    observers: tuple[str, ...] = (),
    night: date | None = None,
    on_written: Callable[[Event], None] = lambda event: None,
    on_trouble: Callable[[str | None], None] = lambda text: None,
) -> Opened:
    """Open tonight (or another night) of a logbook for writing, and make its first plan ready.

    LogbookFaults when a file has faults, LogError when the log can't be had.
    """
    logbook = load_logbook(folder)
    site = logbook.observatory.site
    night = night or night_of(clock.now_mjd(), site.timezone)
    header = Header.of(logbook.observatory, night, observers, f"warmroom {version('warmroom')}")
    log = NightLog.open(folder, header, clock.now_mjd())
    try:
        state = fold(log.events)
        done = done_for(logbook, night, state.added)
        planner = Planner(logbook, night, done, added=state.added)
    except BaseException:
        log.close()
        raise
    worker = LogWorker(log, clock, on_written, on_trouble)
    return Opened(Watch(planner, worker, clock, state), log.path, log.findings)


def done_for(logbook: Logbook, night: date, added: tuple[TargetAdded, ...]) -> tuple[Taken, ...]:
    """Return what all other nights have done for the targets of a logbook and those added."""
    names = [target.name for target in listed(logbook, added).targets]
    return done_before(logbook.folder, night, names)
