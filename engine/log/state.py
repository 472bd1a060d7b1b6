"""The state of a night: a fold over its events, and nothing else.

What the screen shows, what a second reader sees and what a review finds years later all come from
here, so they cannot disagree.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass, field, replace

from engine.log.events import (
    Amendment,
    Close,
    Conditions,
    Event,
    Exposure,
    ExposureStart,
    LostTime,
    Note,
    OrderProposed,
    Override,
    Pointing,
    RunStart,
    RunStop,
    TargetAdded,
)
from engine.log.keys import changed
from engine.log.values import Value

OpenExposure = ExposureStart

# What `undo` reaches for: entries of the observer, not what the console wrote by itself. An
# exposure that was taken can't be undone; it is rejected, and that can be.
UNDOABLE = (Amendment, Conditions, LostTime, Note, Override, Pointing, RunStart, TargetAdded)


@dataclass(frozen=True, slots=True)
class RunStep:
    """One filter of a run: so many exposures of so many seconds, and how many are taken."""

    filter: str
    seconds: float
    count: int
    taken: int = 0


@dataclass(frozen=True, slots=True)
class Run:
    """The run under way: its n, its target, and its steps in order."""

    n: int
    target: str
    steps: tuple[RunStep, ...]


@dataclass(frozen=True, slots=True)
class Lost:
    """A stretch of lost time (UTC MJD); ``end_mjd`` is None while it lasts."""

    n: int
    cause: str
    begin_mjd: float
    end_mjd: float | None = None


@dataclass(frozen=True, slots=True)
class Measured:
    """A seeing value: when (UTC MJD), zenith at 500 nm (arcsec), and the event it came in.

    One that was measured on an exposure is of that exposure's middle, however late it was typed.
    """

    mjd: float
    zenith_arcsec: float
    n: int


@dataclass(frozen=True, slots=True)
class Latest:
    """The last value entered of one quantity, and when (UTC MJD)."""

    value: float
    mjd: float


@dataclass(frozen=True, slots=True)
class NightState:
    """Everything a log says at one point of it.

    ``events`` is the whole log as written; all the rest is of the effective night, with amendments
    carried out and what was withdrawn left out.

    ``exposing`` is the last exposure that began and has no record. It outlives a close: when the
    night is taken up again the observer says what became of it. One that begins after it takes its
    place, and then only the log still shows it.
    """

    events: tuple[Event, ...] = ()
    withdrawn: frozenset[int] = frozenset()
    pointing: Pointing | None = None
    run: Run | None = None
    exposing: OpenExposure | None = None
    exposures: tuple[Exposure, ...] = ()
    seeing: tuple[Measured, ...] = ()
    lost: tuple[Lost, ...] = ()
    notes: tuple[Note, ...] = ()
    overrides: tuple[Override, ...] = ()
    added: tuple[TargetAdded, ...] = ()
    order: OrderProposed | None = None
    closed: bool = False
    conditions: dict[str, Latest] = field(default_factory=dict)

    @property
    def kept(self) -> tuple[Exposure, ...]:
        """The exposures that count for their plans."""
        return tuple(each for each in self.exposures if each.outcome == "good")

    @property
    def lost_since(self) -> Lost | None:
        """The lost time that still lasts; None when none does."""
        return self.lost[-1] if self.lost and self.lost[-1].end_mjd is None else None

    def latest(self, quantity: str) -> Latest | None:
        """Return the last value entered of a quantity of `Conditions`, by its key."""
        return self.conditions.get(quantity)

    def event(self, n: int) -> Event | None:
        """Return the event with a number as it was written; None when there is none."""
        return next((each for each in reversed(self.events) if each.n == n), None)

    def after(self, event: Event) -> NightState:
        """Return the state with one more event: the same as folding everything again."""
        if isinstance(event, Amendment) or (self.events and event.n < self.events[-1].n):
            return fold((*self.events, event))
        return _apply(replace(self, events=(*self.events, event)), event)


def fold(events: Iterable[Event]) -> NightState:
    """Return the state after all events, in the order of their numbers.

    An amendment concerns an entry before it. What is withdrawn is gone, and an amendment that is
    itself withdrawn by a later one never was. Changes are carried out in order; those of another
    amendment are not, it can only be withdrawn. Then the effective events are applied in order.
    """
    written = tuple(sorted(events, key=lambda event: event.n))
    withdrawn = _withdrawn(written)
    state = NightState()
    for event in _effective(written, withdrawn):
        state = _apply(state, event)
    return replace(state, events=written, withdrawn=withdrawn)


def effective(events: Iterable[Event]) -> tuple[Event, ...]:
    """Return the events that stand, in the order of their numbers, with amendments carried out.

    They are what `fold` folds, for questions that its state does not answer.
    """
    written = tuple(sorted(events, key=lambda event: event.n))
    return tuple(_effective(written, _withdrawn(written)))


def last_undoable(state: NightState) -> Event | None:
    """Return the entry that `undo` would withdraw now: the last of the observer's that stands.

    Where the telescope was and which run it did stand fast once something was exposed there.
    """
    was_exposed = False
    for event in reversed(state.events):
        was_exposed |= isinstance(event, Exposure)
        if not isinstance(event, UNDOABLE) or event.n in state.withdrawn:
            continue
        if was_exposed and isinstance(event, Pointing | RunStart):
            continue
        if isinstance(event, Amendment) and (event.withdrawn or event.with_n is not None):
            continue
        return event
    return None


def _withdrawn(events: tuple[Event, ...]) -> frozenset[int]:
    """Return the numbers of what is withdrawn, worked out from the last entry to the first.

    So whatever could withdraw an entry is settled before the entry itself is looked at.
    """
    amendments = [event for event in events if isinstance(event, Amendment)]
    gone: set[int] = set()
    for event in reversed(amendments):
        if event.with_n is not None and event.with_n < event.n and event.with_n in gone:
            gone.add(event.n)
        if event.withdrawn and event.of < event.n and event.n not in gone:
            gone.add(event.of)
    return frozenset(gone)


def _effective(events: tuple[Event, ...], withdrawn: frozenset[int]) -> list[Event]:
    changes: dict[int, dict[str, Value]] = {}
    for event in events:
        if isinstance(event, Amendment) and event.of < event.n and event.n not in withdrawn:
            changes.setdefault(event.of, {}).update(event.changes)
    return [
        changed(event, changes[event.n]) if event.n in changes else event
        for event in events
        if event.n not in withdrawn
    ]


def _apply(state: NightState, event: Event) -> NightState:
    """Return the state after one effective event."""
    state = replace(state, closed=False) if state.closed else state
    match event:
        case Pointing():
            return replace(state, pointing=event)
        case RunStart():
            steps = zip(event.filters, event.seconds, event.counts, strict=False)
            run = Run(event.n, event.target, tuple(RunStep(*step) for step in steps))
            return replace(state, run=run)
        case RunStop():
            return replace(state, run=None)
        case ExposureStart():
            # One that never got its record is superseded: only the log keeps it.
            return replace(state, exposing=event)
        case Exposure():
            return _after_exposure(state, event)
        case Conditions():
            return _after_conditions(state, event)
        case LostTime():
            return _after_lost_time(state, event)
        case Note():
            return replace(state, notes=(*state.notes, event))
        case OrderProposed():
            return replace(state, order=event)
        case Override():
            return replace(state, overrides=(*state.overrides, event))
        case TargetAdded():
            return replace(state, added=(*state.added, event))
        case Close():
            return replace(state, closed=True)
        case _:
            return state


def _after_exposure(state: NightState, event: Exposure) -> NightState:
    open_one = state.exposing
    state = replace(
        state,
        exposures=(*state.exposures, event),
        exposing=None if open_one is not None and open_one.n == event.of else open_one,
    )
    run = state.run
    if run is None or run.n != event.run or event.outcome not in ("good", "rejected"):
        return state
    steps = list(run.steps)
    for place, step in enumerate(steps):
        if step.filter == event.filter and step.taken < step.count:
            steps[place] = replace(step, taken=step.taken + 1)
            break
    return replace(state, run=replace(run, steps=tuple(steps)))


def _after_conditions(state: NightState, event: Conditions) -> NightState:
    entered = {
        name: Latest(value, event.t_mjd)
        for name in CONDITION_KEYS
        if (value := getattr(event, name)) is not None
    }
    seeing = state.seeing
    if event.seeing_arcsec is not None:
        measured = next((each for each in state.exposures if each.n == event.of), None)
        mjd = event.t_mjd if measured is None else measured.mid_mjd
        seeing = (*seeing, Measured(mjd, event.seeing_arcsec, event.n))
    return replace(state, conditions=state.conditions | entered, seeing=seeing)


# The quantities of `Conditions` that have a latest value.
CONDITION_KEYS = (
    "seeing_arcsec",
    "cloud_percent",
    "wind_m_per_s",
    "humidity_percent",
    "temperature_c",
    "dew_point_c",
    "pressure_hpa",
    "sky_mag_arcsec2",
)


def _after_lost_time(state: NightState, event: LostTime) -> NightState:
    lost = state.lost
    if state.lost_since is not None:
        lost = (*lost[:-1], replace(lost[-1], end_mjd=event.t_mjd))
    if event.phase == "begin":
        lost = (*lost, Lost(event.n, event.cause, event.t_mjd))
    return replace(state, lost=lost)
