"""What the night is waiting for: the state of things as one small answer.

The whole common round - accept the proposal, on target, start the run, expose - is a walk through
these stages; one key moves from each to the next.
"""

from __future__ import annotations

from dataclasses import dataclass
from enum import Enum

from engine.log import NightState


class Stage(Enum):
    """Where in the round the night is; the value is what the screen calls it."""

    CUT_OFF = "an exposure was cut off"
    LOST = "time is being lost"
    EXPOSING = "exposing"
    BETWEEN = "between exposures"
    MOVING = "moving to the target"
    READY = "on target"
    IDLE = "nothing under way"


@dataclass(frozen=True, slots=True)
class NextExposure:
    """The next exposure of a run: its filter, its length (s), which of how many it is."""

    filter: str
    seconds: float
    number: int
    of: int


def stage_of(state: NightState, doubted: bool) -> Stage:
    """Return the stage of a night.

    ``doubted`` says that the open exposure began before this console took the night over, or that
    the clock jumped over its end, and that the observer has not yet said what became of it: only
    she knows, the camera was not watched.
    """
    if state.exposing is not None:
        return Stage.CUT_OFF if doubted else Stage.EXPOSING
    if state.lost_since is not None:
        return Stage.LOST
    if state.run is not None:
        return Stage.BETWEEN
    if state.pointing is None:
        return Stage.IDLE
    return Stage.READY if state.pointing.on_target else Stage.MOVING


def next_in_run(state: NightState) -> NextExposure | None:
    """Return the exposure that comes next in the run under way; None when the run is complete."""
    if state.run is None:
        return None
    for step in state.run.steps:
        if step.taken < step.count:
            return NextExposure(step.filter, step.seconds, step.taken + 1, step.count)
    return None
