"""Looking on: a night that somebody else runs, followed through its log and never written to."""

from __future__ import annotations

from datetime import date
from pathlib import Path
from typing import TypeVar

from engine.clock import Clock, HandClock, SystemClock
from engine.errors import Fault, LogError, NoAnswer, NotNow
from engine.log import Event, Follower
from engine.logbook import load_logbook
from engine.times import night_of
from engine.watch.opening import Opened, done_for
from engine.watch.planning import Planned, Planner
from engine.watch.triggers import Wish, Work
from engine.watch.watch import Watch

E = TypeVar("E", bound=Event)


class _NoPen:
    """Stands where a writer would: it has nothing to write and refuses everything."""

    unwritten = 0
    trouble: str | None = None

    def submit(self, event: E) -> E:
        """Refuse."""
        raise NotNow("this console looks on; only the one that runs the night writes")

    def close(self) -> bool:
        """Have nothing left to write."""
        return True

    def rescue(self, folder: Path) -> Path:
        """Have nothing to save."""
        return folder


class Onlooker(Watch):
    """A watch over a night that somebody else runs: same state, same advice, read-only."""

    is_read_only = True

    def __init__(self, planner: Planner, follower: Follower, clock: Clock) -> None:
        super().__init__(planner, _NoPen(), clock)
        self._follower = follower
        self._take_in()

    @property
    def trouble(self) -> str | None:
        """Why nothing new can be read; None when all is well."""
        return self._follower.trouble

    def tick(self) -> None:
        """Read what the night's own console has added since."""
        if self._follower.poll():
            self._take_in()
        self._want_what_is_old()

    def vouch(self) -> None:
        """Refuse: it is for the observer to say."""
        raise NotNow("this console looks on; the observer decides")

    def adopt(self, planned: Planned) -> None:
        """Put a plan in force, without a word in the log."""
        self.plan, self.planner = planned.plan, planned.planner
        self.version += 1

    def close(self, why: str = "") -> str | None:
        """Let the night go."""
        return None

    def _take_in(self) -> None:
        self._state = self._follower.state
        self._doubted_n = 0
        self._want(Wish(Work.AFRESH, "the night went on"))
        self.version += 1
        # A night that is not tonight's stands still at its last entry.
        if isinstance(self.clock, HandClock) and self._state.events:
            self.clock.set_mjd(self._state.events[-1].t_mjd)


def open_onlooker(folder: Path, night: date | None = None) -> Opened:
    """Open tonight (or another night) of a logbook for looking on.

    LogbookFaults when a file has faults, NoAnswer when the night has no log, LogError when it can't
    be read.
    """
    logbook = load_logbook(folder)
    tonight = night_of(SystemClock().now_mjd(), logbook.observatory.site.timezone)
    night = night or tonight
    path = folder / f"{night.isoformat()}.toml"
    if not path.exists():
        raise NoAnswer(f"{path}: nobody has opened this night, so there is nothing to follow")
    follower = Follower(path)
    follower.poll()
    if follower.reading is None:
        raise LogError(follower.trouble or f"{path}: can't be read")
    added = follower.state.added
    planner = Planner(logbook, night, done_for(logbook, night, added), added=added)
    clock: Clock = SystemClock() if night == tonight else HandClock(float(planner.night.mjd[0]))
    findings: tuple[Fault, ...] = follower.findings
    return Opened(Onlooker(planner, follower, clock), path, findings)
