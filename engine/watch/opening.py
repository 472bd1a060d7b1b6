"""Opening a night: the folder, the log, the tables, all in one place for console and rehearsal."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from importlib.metadata import version
from pathlib import Path

from engine.clock import Clock
from engine.errors import Fault, LogError
from engine.log import Event, Exposure, Header, LogWorker, NightLog, fold, night_logs, read_log
from engine.logbook import load_logbook
from engine.times import night_of
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
        added = fold(log.events).added
        planner = Planner(logbook, night, done_before(folder, night), added=added)
    except BaseException:
        log.close()
        raise
    worker = LogWorker(log, clock, on_written, on_trouble)
    return Opened(Watch(planner, worker, clock, log.events), log.path, log.findings)


def done_before(folder: Path, night: date) -> tuple[Exposure, ...]:
    """Return the exposures of all other nights that count for their plans.

    A log that can't be read counts for nothing; `warmroom check` says what is wrong with it.
    """
    kept: list[Exposure] = []
    for path in night_logs(folder):
        if path.stem == night.isoformat():
            continue
        try:
            kept += fold(read_log(path).events).kept
        except LogError:
            continue
    return tuple(kept)
