"""The live night: its log, its state, its clock, the plan in force, and what the observer does.

Every act becomes an event, every event goes to the log, and the state is the fold over the log:
there is no other record. Acts return at once; writing is the log worker's, planning is the
caller's (see `Watch.planning`), so neither a slow disk nor a long computation holds up a
count-down.
"""

from __future__ import annotations

from dataclasses import dataclass

from engine.clock import Clock
from engine.errors import WarmroomError
from engine.log import (
    Close,
    Event,
    ExposureStart,
    LogWorker,
    NightState,
    RunStop,
    fold,
)
from engine.night import Plans, TargetNow, targets_at
from engine.times import SECONDS_PER_DAY
from engine.watch.planning import Plan, Planner
from engine.watch.record import Ending
from engine.watch.step import Stage, next_in_run, stage


class NotNow(WarmroomError):
    """The act makes no sense at this stage of the night; says why."""


@dataclass(frozen=True, slots=True)
class Settled:
    """The times (UTC MJD) that decide when the next exposure of a run begins."""

    ready_mjd: float


class Watch:
    """One night at the telescope, from the log on disk to the advice on the screen."""

    def __init__(
        self, planner: Planner, worker: LogWorker, clock: Clock, events: tuple[Event, ...] = ()
    ) -> None:
        self.planner = planner
        self.clock = clock
        self.plan: Plan | None = None
        self.version = 0
        self._worker = worker
        self._state = fold(events)
        self._doubted_n = self._state.exposing.n if self._state.exposing else 0
        self._resume_mjd = clock.now_mjd()
        self._wanted: str | None = "the night begins"

    # What is known

    @property
    def state(self) -> NightState:
        """The night so far, as a fold over its events."""
        return self._state

    @property
    def stage(self) -> Stage:
        """What the night is waiting for."""
        exposing = self._state.exposing
        return stage(self._state, doubted=exposing is not None and exposing.n == self._doubted_n)

    @property
    def unwritten(self) -> int:
        """How many events are not yet on disk."""
        return self._worker.unwritten

    def plans(self) -> Plans:
        """Return every target's plan with what is done."""
        return self.planner.plans(self._state)

    def targets_now(self) -> tuple[TargetNow, ...]:
        """Return every target at this moment; empty until the first plan is there."""
        if self.plan is None:
            return ()
        now_mjd = self.clock.now_mjd()
        return targets_at(self.planner.night, self.plan.outlook, now_mjd, self.plans())

    # What is done

    def submit(self, event: Event, because: str | None = None) -> Event:
        """Log an event and fold it in; ``because`` asks for a new plan and says why."""
        stamped = self._worker.submit(event)
        self._state = self._state.after(stamped)
        self.version += 1
        if because:
            self._wanted = because
        return stamped

    def vouch(self) -> None:
        """Say that the exposure that was open when the console came back still counts."""
        self._doubted_n = 0
        self.version += 1

    def close(self) -> None:
        """Log that the console was left, wait for the disk, and let the log go."""
        self.submit(Close(why="left by the observer"))
        self._worker.close()

    # The clockwork

    def tick(self) -> None:
        """Do everything that has come due: end exposures, begin the next of a run."""
        now_mjd = self.clock.now_mjd()
        while self._one_due(now_mjd):
            pass

    def _one_due(self, now_mjd: float) -> bool:
        match self.stage:
            case Stage.EXPOSING:
                exposing = self._state.exposing
                assert exposing is not None
                end_mjd = exposing.start_mjd + exposing.seconds / SECONDS_PER_DAY
                if now_mjd < end_mjd:
                    return False
                self.end_exposure(Ending(end_mjd, "good"))
                return True
            case Stage.BETWEEN:
                return self._continue_run(now_mjd)
            case _:
                return False

    def _continue_run(self, now_mjd: float) -> bool:
        run, step = self._state.run, next_in_run(self._state)
        assert run is not None
        if step is None:
            self.submit(RunStop(of=run.n, why="finished"), because="a run was finished")
            return True
        start_mjd = self._next_start_mjd(step.filter)
        if now_mjd < start_mjd:
            return False
        self.submit(
            ExposureStart(
                run=run.n,
                target=run.target,
                programme=self.programme_of(run.target),
                filter=step.filter,
                seconds=step.seconds,
                start_mjd=start_mjd,
                frame="",
            )
        )
        return True
