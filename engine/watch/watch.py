"""The live night: its log, its state, its clock, and the plan in force.

Everything that happens becomes an event, every event goes to the log, and the state is the fold
over the log: there is no other record. Nothing here waits: writing is the log worker's, planning
the caller's (see `Watch.planning`), so neither a slow disk nor a long computation holds up a
count-down. What the observer does is in `engine.watch.acts`.
"""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path
from typing import Protocol

from engine.clock import Clock
from engine.log import (
    ClockStep,
    Close,
    Event,
    ExposureStart,
    NightState,
    OpenExposure,
    OrderProposed,
    Override,
    RunStop,
)
from engine.logbook import Logbook
from engine.night import Plans, TargetNow, targets_at
from engine.times import MINUTES_PER_DAY, SECONDS_PER_DAY
from engine.watch.plan import Plan
from engine.watch.planning import Planned, Planner
from engine.watch.record import Ending, exposure_record
from engine.watch.rules import decided, rules_from
from engine.watch.stage import NextExposure, Stage, next_in_run, stage_of
from engine.watch.triggers import Wish, Work, work_after

# How often a plan is made afresh though nothing happened: the sky turns.
REPLAN_MIN = 10.0
# How many little searches each plan is worth while nothing happens.
IDLE_TURNS = 12
# How many visits of a new order are written to the log.
ORDER_LOGGED = 8
# Times in the log are rounded to the millisecond, so that one of now may read as one before it.
ROUNDING_DAYS = 0.001 / SECONDS_PER_DAY
UNWATCHED = "its next exposure came due while the console was away"


class Pen(Protocol):
    """What takes events to the log: `LogWorker`, or nobody for one who only looks on."""

    @property
    def unwritten(self) -> int:
        """How many events are not yet on disk."""
        ...

    @property
    def trouble(self) -> str | None:
        """What is wrong with the disk and what to do; None when all is well."""
        ...

    def submit(self, event: Event) -> Event:
        """Take an event; return it numbered and stamped."""
        ...

    def close(self) -> bool:
        """Write what can be written and let the log go; return whether all was."""
        ...

    def rescue(self, folder: Path) -> Path:
        """Write the whole log, what is not yet on disk included, into another folder."""
        ...


class Watch:
    """One night at the telescope, from the log on disk to the advice on the screen."""

    is_read_only = False

    def __init__(
        self, planner: Planner, pen: Pen, clock: Clock, state: NightState | None = None
    ) -> None:
        self.planner = planner
        self.clock = clock
        self.plan: Plan | None = None
        # Grows with every change of what may be shown, so that a view can tell when to look again.
        self.version = 0
        self._pen = pen
        self._state = state or NightState()
        self._doubted_n = self._state.exposing.n if self._state.exposing else 0
        # Since when somebody has seen what the camera does: nothing before it is counted unasked.
        self._watched_mjd = clock.now_mjd() - ROUNDING_DAYS
        self._wanted: Wish | None = Wish(Work.AFRESH, "the night begins")
        self._idle_turns = 0
        self._is_closed = False
        self._parting: str | None = None
        self._kept_plans: tuple[int, Plans] = (-1, {})
        self._kept_seen: tuple[object, tuple[TargetNow, ...]] = (None, ())
        self._logbook: Logbook | None = None

    # What is known

    @property
    def state(self) -> NightState:
        """The night so far, as a fold over its events."""
        return self._state

    @property
    def stage(self) -> Stage:
        """What the night is waiting for."""
        exposing = self._state.exposing
        return stage_of(self._state, exposing is not None and exposing.n == self._doubted_n)

    @property
    def unwritten(self) -> int:
        """How many events are not yet on disk."""
        return self._pen.unwritten

    @property
    def trouble(self) -> str | None:
        """What is wrong with the disk and what to do about it; None when all is well."""
        return self._pen.trouble

    def plans(self) -> Plans:
        """Return every target's plan with what is done."""
        if self._kept_plans[0] != self.version:
            self._kept_plans = (self.version, self.planner.plans(self._state))
        return self._kept_plans[1]

    def targets_now(self) -> tuple[TargetNow, ...]:
        """Return every target at this moment; empty until the first plan is there."""
        if self.plan is None:
            return ()
        now_mjd = self.clock.now_mjd()
        made = decided(rules_from(self._state, now_mjd))
        night = self.planner.night
        # Panels ask several times a paint, and until the next minute nothing else has moved.
        asked = (self.version, night.index_at(now_mjd), made)
        if self._kept_seen[0] != asked:
            seen = targets_at(night, self.plan.outlook, now_mjd, self.plans(), made)
            self._kept_seen = (asked, seen)
        return self._kept_seen[1]

    def next_exposure(self) -> tuple[NextExposure, float] | None:
        """Return what comes next in the run under way and when (UTC MJD); None without a run.

        The camera reads out, and the wheel turns if the filter changes.
        """
        step = next_in_run(self._state)
        run = self._state.run
        if step is None or run is None:
            return None
        observatory = self.planner.logbook.observatory
        last = self._state.exposures[-1] if self._state.exposures else None
        ready_mjd, wait_s = self._run_began_mjd(run.n), 0.0
        if last is not None and last.run == run.n:
            ready_mjd, wait_s = last.end_mjd, observatory.camera.readout_s
        if last is None or last.filter != step.filter:
            # A filter may have left the wheel's description since the run began.
            turns_s = {each.name: each.change_s for each in observatory.filters}
            wait_s += turns_s.get(step.filter, 0.0)
        return step, ready_mjd + wait_s / SECONDS_PER_DAY

    def _run_began_mjd(self, n: int) -> float:
        began = self._state.event(n)
        return began.t_mjd if began is not None else self.clock.now_mjd()

    # What happens

    def submit(self, event: Event, because: str | None = None) -> Event:
        """Log an event and fold it in; ``because`` asks for a new plan and says why."""
        stamped = self._pen.submit(event)
        self._state = self._state.after(stamped)
        self.version += 1
        if isinstance(event, ClockStep):
            self._doubt_what_was_jumped_over()
        decision = event if isinstance(event, Override) and event.action != "release" else None
        if because or decision is not None:
            self._want(Wish(work_after(event), because or "", decision))
        return stamped

    def _want(self, wish: Wish) -> None:
        self._wanted = self._wanted.and_then(wish) if self._wanted else wish

    def _doubt_what_was_jumped_over(self) -> None:
        """Leave to the observer an exposure whose end the clock has jumped over, as in a sleep."""
        now_mjd, exposing = self.clock.now_mjd(), self._state.exposing
        self._watched_mjd = now_mjd - ROUNDING_DAYS
        if exposing is not None and _end_mjd(exposing) <= now_mjd:
            self._doubted_n = exposing.n

    def vouch(self) -> None:
        """Take the observer's word that the exposure open when the console came back still runs."""
        self._settle_doubt()
        self.version += 1

    def renew(self, logbook: Logbook, because: str) -> None:
        """Go on with the logbook as it was read anew; ``because`` says what changed in it."""
        self._logbook = logbook
        self._want(Wish(Work.AFRESH, because))
        self.version += 1

    def end_exposure(self, ending: Ending) -> Event:
        """Log the record of the exposure under way, ended as said."""
        began = self._state.exposing
        if began is None:
            raise ValueError("no exposure is under way")
        self._settle_doubt()
        seeing = self.planner.forecast(self._state, ending.end_mjd).now_arcsec
        record = exposure_record(self.planner.night, self.planner.model, began, ending, seeing)
        return self.submit(record, because="an exposure ended")

    def _settle_doubt(self) -> None:
        if self._doubted_n:
            self._doubted_n, self._watched_mjd = 0, self.clock.now_mjd() - ROUNDING_DAYS

    def close(self, why: str = "left by the observer") -> str | None:
        """Log that the console was left, and wait for the disk; return what it could not take.

        A log that can't be written in its place is saved whole in the observer's home. Closing
        again changes nothing and returns the same: a signal may come while the console is left.
        """
        if not self._is_closed:
            self._is_closed = True
            self.submit(Close(why=why))
            self._parting = None if self._pen.close() else self._rescued()
        return self._parting

    def _rescued(self) -> str:
        """Save the log elsewhere; return what the observer must be told of that."""
        try:
            saved = self._pen.rescue(Path.home())
        except (OSError, RuntimeError) as error:  # RuntimeError: nobody's home is known
            return f"{self.unwritten} entries of the log could not be written anywhere: {error}"
        return f"the log could not be written in its place; the whole night is in {saved}"

    # The clockwork

    def tick(self) -> None:
        """Do everything that has come due: end exposures, begin the next of a run, want a plan."""
        now_mjd = self.clock.now_mjd()
        while self._one_due(now_mjd):
            pass
        self._want_what_is_old()

    def _want_what_is_old(self) -> None:
        """Want a plan anew when the sky has turned since the last one."""
        plan = self.plan
        if plan is not None:
            age_min = (self.clock.now_mjd() - plan.made_mjd) * MINUTES_PER_DAY
            if age_min > REPLAN_MIN:
                self._want(Wish(Work.RETIME, "the sky turned"))

    def _one_due(self, now_mjd: float) -> bool:
        stage, exposing = self.stage, self._state.exposing
        if stage is Stage.EXPOSING and exposing is not None:
            end_mjd = _end_mjd(exposing)
            if now_mjd >= end_mjd:
                self.end_exposure(Ending(end_mjd, "good"))
                return True
        elif stage is Stage.BETWEEN:
            return self._continue_run(now_mjd)
        return False

    def _continue_run(self, now_mjd: float) -> bool:
        run, due = self._state.run, self.next_exposure()
        if run is None:
            return False
        if due is None:
            self.submit(RunStop(of=run.n, why="finished"), because="a run was finished")
            return True
        step, start_mjd = due
        if now_mjd < start_mjd:
            return False
        if start_mjd < self._watched_mjd:
            # Whether the camera went on by itself is not known, so nothing of it is counted.
            self.submit(RunStop(of=run.n, why=UNWATCHED), because="a run was cut off")
            return True
        programmes = {each.name: each.programme for each in self.planner.night.targets}
        self.submit(
            ExposureStart(
                run=run.n,
                target=run.target,
                programme=programmes.get(run.target, ""),
                filter=step.filter,
                seconds=step.seconds,
                start_mjd=start_mjd,
            )
        )
        return True

    # Planning

    def planning(self) -> Callable[[], Planned] | None:
        """Return the work that is wanted, to be done on any thread; None when none is.

        The result is handed to `adopt`. Asking takes the wish away: what happens meanwhile asks
        again.
        """
        wish, self._wanted = self._wanted, None
        if wish is None:
            return None
        planner, state, before = self.planner, self._state, self.plan
        logbook, now_mjd = self._logbook, self._now_mjd()
        self._idle_turns = 0

        def work() -> Planned:
            fit = planner.fit(state, now_mjd, logbook)
            return Planned(fit, fit.plan(state, now_mjd, wish, before))

        return work

    def idling(self) -> Callable[[], Planned | None] | None:
        """Return a little work that looks for a better order; None when enough was looked.

        Like `planning`, to be done on any thread; it returns None when nothing clearly better was
        found.
        """
        planner, state, plan = self.planner, self._state, self.plan
        if plan is None or self._wanted is not None or self._idle_turns >= IDLE_TURNS:
            return None
        self._idle_turns += 1
        seed, now_mjd = self._idle_turns, self._now_mjd()

        def work() -> Planned | None:
            better = planner.refined(state, now_mjd, plan, seed)
            return Planned(planner, better) if better is not None else None

        return work

    def _now_mjd(self) -> float:
        """Return now; an entry of this very millisecond counts: its time may be rounded up."""
        last_mjd = self._state.events[-1].t_mjd if self._state.events else 0.0
        return max(self.clock.now_mjd(), last_mjd)

    def adopt(self, planned: Planned) -> None:
        """Put a plan in force; a changed turn of targets goes into the log."""
        plan = planned.plan
        before, self.plan, self.planner = self.plan, plan, planned.planner
        self.version += 1
        ahead = plan.order.visits[:ORDER_LOGGED]
        if before is None or [v.target for v in ahead[:1]] != _first_ahead(before, plan.made_mjd):
            self.submit(
                OrderProposed(
                    targets=tuple(visit.target for visit in ahead),
                    starts_mjd=tuple(visit.start_mjd for visit in ahead),
                    value=round(plan.order.value, 1),
                    why=plan.because,
                )
            )


def _end_mjd(exposing: OpenExposure) -> float:
    """Return when an exposure will have had its time (UTC MJD)."""
    return exposing.start_mjd + exposing.seconds / SECONDS_PER_DAY


def _first_ahead(plan: Plan, now_mjd: float) -> list[str]:
    """Return the target, in a list, that an earlier plan would have next at a moment."""
    return [visit.target for visit in plan.ahead(now_mjd)[:1]]
