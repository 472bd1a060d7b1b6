"""The demo's lesson: what to press next and why, a line at a time, each until it was done.

It watches the night and nothing else: whoever does something else first has simply gone on.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

from tui.console.keys import Keys

if TYPE_CHECKING:
    from engine.log import NightState
    from engine.watch import Watch

# How many ticks a line waits before it is said again.
AGAIN_TICKS = 60


@dataclass(frozen=True, slots=True)
class Step:
    """One line: the action whose key it names, what to say of it, and when it was done."""

    action: str
    says: str
    done: Callable[[NightState], bool]


STEPS: tuple[Step, ...] = (
    Step("go_on", "accepts the proposal: the telescope is sent there", lambda s: bool(s.pointing)),
    Step(
        "go_on",
        "again, when it stands there: on target",
        lambda s: s.pointing is not None and s.pointing.on_target,
    ),
    Step("go_on", "starts the run; the exposures count themselves", lambda s: bool(s.exposing)),
    Step(
        "measure",
        "types the FWHM measured on the last frame, say 1.4: every prediction follows it",
        lambda s: bool(s.seeing),
    ),
    Step(
        "seeing",
        "types the zenith seeing: try 3.5, and see what becomes too soft",
        lambda s: any(each.zenith_arcsec > 3.0 for each in s.seeing),
    ),
    Step("undo", "takes the last entry back; the log keeps both", lambda s: bool(s.withdrawn)),
    Step(
        "drop",
        "drops the target under the cursor for tonight, and says what that costs",
        lambda s: any(each.action == "drop" for each in s.overrides),
    ),
    Step(
        "lost",
        "says that time is lost, to cloud for instance; space ends it",
        lambda s: bool(s.lost),
    ),
)
END = "That is the round. {views} show the other views, {help} every key; {leave} leaves."


class Lesson:
    """Tells the next line when the one before was done; an autopilot that does nothing itself."""

    def __init__(self, keys: Keys) -> None:
        self._keys = keys
        self._place = 0
        self._waited = 0

    def tick(self, watch: Watch) -> tuple[str, ...]:
        """Return the line to tell now, if there is one."""
        place = self._place
        while place < len(STEPS) and STEPS[place].done(watch.state):
            place += 1
        if self._place == len(STEPS):
            return ()
        self._waited += 1
        is_new = place > self._place or self._waited == 1
        if not is_new and self._waited % AGAIN_TICKS:
            return ()
        self._place = place
        if place == len(STEPS):
            return (self._end(),)
        step = STEPS[place]
        return (f"LESSON {place + 1} of {len(STEPS)}: {self._cap(step.action)} {step.says}",)

    def _end(self) -> str:
        views = f"{self._cap('view_night')} to {self._cap('view_past')}"
        return END.format(views=views, help=self._cap("help"), leave=self._cap("leave"))

    def _cap(self, action: str) -> str:
        return self._keys.cap_of(action) or "ctrl+p"
