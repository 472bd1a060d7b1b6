"""Steps of the computer's clock: noticed against the clock that only ever runs forward.

A time service that puts the clock right in the middle of a night, or a computer that slept, would
leave times in the log that can't be explained later.
"""

from __future__ import annotations

import time
from collections.abc import Callable

from engine.clock import Clock
from engine.log.events import ClockStep
from engine.times import SECONDS_PER_DAY

# Less is the drift that a time service takes out bit by bit; no exposure suffers from it.
LEAST_STEP_S = 0.5


class StepWatch:
    """Compares a clock with the computer's monotonic one each time it is asked."""

    def __init__(self, clock: Clock, monotonic_s: Callable[[], float] = time.monotonic) -> None:
        self._clock = clock
        self._monotonic_s = monotonic_s
        self._seen = self._look()

    def step(self) -> ClockStep | None:
        """Return the event to log when the clock jumped since the last call; None when it ran on.

        ``seconds`` is positive for a jump forward, and so it is when the computer slept.
        """
        mjd, steady_s, pace = self._seen
        self._seen = now_mjd, now_s, now_pace = self._look()
        if now_pace != pace:
            return None
        ran_s = (now_mjd - mjd) * SECONDS_PER_DAY
        jumped_s = ran_s - (now_s - steady_s) * pace
        if abs(jumped_s) < LEAST_STEP_S * max(pace, 1.0):
            return None
        why = "the clock was set back" if jumped_s < 0 else "the clock was set forward, or it slept"
        return ClockStep(seconds=round(jumped_s, 3), why=why)

    def _look(self) -> tuple[float, float, float]:
        return self._clock.now_mjd(), self._monotonic_s(), self._clock.pace
