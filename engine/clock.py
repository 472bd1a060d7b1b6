"""Clocks. Nothing in warmroom asks the computer for the time except through one of these."""

from __future__ import annotations

import time
from typing import Protocol

from engine.times import SECONDS_PER_DAY

UNIX_EPOCH_MJD = 40587.0


class Clock(Protocol):
    """Something that knows what time it is."""

    @property
    def pace(self) -> float:
        """How many seconds of the night pass in one second of the computer's."""
        ...

    def now_mjd(self) -> float:
        """Return the moment now, UTC MJD (days)."""
        ...


class SystemClock:
    """The computer's own clock."""

    pace = 1.0

    def now_mjd(self) -> float:
        """Return the moment now, UTC MJD (days)."""
        return UNIX_EPOCH_MJD + time.time() / SECONDS_PER_DAY


class PacedClock:
    """A clock that starts at a chosen moment and runs faster (or slower) than real time.

    It counts the computer's monotonic clock, so a step of the wall clock doesn't move it.
    """

    def __init__(self, start_mjd: float, pace: float) -> None:
        self._start_mjd = start_mjd
        self._pace = pace
        self._origin_s = time.monotonic()

    @property
    def pace(self) -> float:
        """Seconds of the night per second of the computer's."""
        return self._pace

    def now_mjd(self) -> float:
        """Return the moment now, UTC MJD (days)."""
        elapsed_s = (time.monotonic() - self._origin_s) * self._pace
        return self._start_mjd + elapsed_s / SECONDS_PER_DAY


class HandClock:
    """A clock that stands still until it is set: for tests and for nights played at full speed."""

    pace = 1.0

    def __init__(self, mjd: float) -> None:
        self._mjd = mjd

    def now_mjd(self) -> float:
        """Return the moment it was last set to, UTC MJD (days)."""
        return self._mjd

    def set_mjd(self, mjd: float) -> None:
        """Set the clock."""
        self._mjd = mjd

    def advance_s(self, seconds: float) -> None:
        """Move the clock on by some seconds (or back)."""
        self._mjd += seconds / SECONDS_PER_DAY
