"""The state of a night: amendments, undo, runs, lost time; step by step the same as all at once."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from hypothesis import given, settings
from hypothesis import strategies as st

from engine.log import (
    KINDS,
    Amendment,
    ClockStep,
    Close,
    Conditions,
    Event,
    Exposure,
    ExposureStart,
    LostTime,
    NightState,
    Note,
    OrderProposed,
    Override,
    Pointing,
    Recovery,
    RunStart,
    RunStop,
    fold,
    last_undoable,
)
from tests.engine.log_nights import any_event, at, exposure


def numbered(*events: Event) -> list[Event]:
    """Return events numbered from 1, a minute apart."""
    return [event.stamped(n, at(n)) for n, event in enumerate(events, start=1)]


def state_of(*events: Event) -> NightState:
    """Return the state after events, numbered from 1."""
    return fold(numbered(*events))


def start(**other: Any) -> ExposureStart:
    """Return an exposure that begins."""
    said: dict[str, Any] = {"target": "KR 12", "filter": "B", "seconds": 60.0, "start_mjd": at(0)}
    return ExposureStart(**said | other)


def record(of: int, **other: Any) -> Exposure:
    """Return the record of an exposure that began as entry ``of``."""
    return exposure(1, 1.0, **{"of": of, "filter": "B", **other})


@st.composite
def tangled_nights(draw: st.DrawFn) -> list[Event]:
    """Draw a night of any events, many of them amendments of one another, withdrawn or not."""
    kinds = st.sampled_from([*sorted(KINDS), "amendment", "amendment", "exposure", "exposure"])
    events: list[Event] = []
    for n in range(1, draw(st.integers(1, 14)) + 1):
        event = draw(any_event(n, draw(kinds)))
        if isinstance(event, Amendment):
            event = replace(
                event,
                of=draw(st.integers(1, 15)),
                with_n=draw(st.none() | st.integers(1, 15)),
                extra=draw(
                    st.sampled_from(
                        [{}, {"outcome": "rejected"}, {"credit": 0.5}, {"target": "X"}, {"n": 99}]
                    )
                ),
            )
        elif isinstance(event, Exposure):
            event = replace(event, of=draw(st.integers(1, 15)), outcome="good")
        events.append(event)
    return events


@settings(max_examples=300, deadline=None)
@given(tangled_nights())
def test_one_event_at_a_time_is_the_same_as_all_at_once(events: list[Event]) -> None:
    """`after`, event by event, gives exactly what folding everything gives, at every step."""
    state = NightState()
    for count, event in enumerate(events, start=1):
        state = state.after(event)
        assert state == fold(events[:count])


@settings(max_examples=100, deadline=None)
@given(tangled_nights(), st.randoms(use_true_random=False))
def test_the_order_in_the_file_does_not_matter(events: list[Event], random: Any) -> None:
    """Numbers say the order: a log with moved blocks is the same night."""
    shuffled = list(events)
    random.shuffle(shuffled)
    assert fold(shuffled) == fold(events)
    state = NightState()
    for event in shuffled:
        state = state.after(event)
    assert state == fold(events)


@settings(max_examples=200, deadline=None)
@given(tangled_nights())
def test_undo_and_undo_of_undo(events: list[Event]) -> None:
    """A withdrawal takes exactly that away; withdrawing the withdrawal brings it exactly back."""
    state = fold(events)
    last = last_undoable(state)
    if last is None:
        return
    assert last.n not in state.withdrawn
    n = events[-1].n + 1
    undone = state.after(Amendment(of=last.n, withdrawn=True).stamped(n, at(n)))
    assert last.n in undone.withdrawn
    assert last_undoable(undone) != last
    back = undone.after(Amendment(of=n, withdrawn=True).stamped(n + 1, at(n + 1)))
    assert back.withdrawn == state.withdrawn | {n}
    same = replace(back, events=state.events, withdrawn=state.withdrawn, closed=state.closed)
    assert same == state


def test_amendments_change_what_counts_in_order() -> None:
    """The last change of a key holds; the log as written is untouched."""
    events = numbered(
        start(),
        record(1, credit=0.9),
        Amendment(of=2, extra={"outcome": "rejected", "credit": 0.1}, why="trailed"),
        Amendment(of=2, extra={"outcome": "good"}, why="not trailed after all"),
    )
    state = fold(events)
    (kept,) = state.kept
    assert (kept.outcome, kept.credit) == ("good", 0.1)
    assert state.events[1] == events[1]
    assert fold(events[:3]).kept == ()


def test_changes_that_do_not_fit_are_passed_over() -> None:
    """A wrong type, an unknown key, a number or a time: the exposure stays as it was."""
    state = state_of(
        start(),
        record(1),
        Amendment(of=2, extra={"filter": 7, "spin": 1, "n": 99, "t": "now", "credit": 0.5}),
    )
    (kept,) = state.exposures
    assert (kept.n, kept.filter, kept.credit, kept.extra) == (2, "B", 0.5, {})


def test_an_amendment_concerns_what_came_before_it() -> None:
    """One that names a later entry, or itself, does nothing."""
    state = state_of(
        Amendment(of=2, withdrawn=True),
        Note(text="stays"),
        Amendment(of=3, withdrawn=True),
    )
    assert [note.text for note in state.notes] == ["stays"]
    assert state.withdrawn == frozenset()


def test_what_hangs_on_a_withdrawn_entry_goes_with_it() -> None:
    """A measured FWHM gave a seeing and a credit: both go when it is undone."""
    events = numbered(
        start(),
        record(1, credit=0.9),
        Conditions(seeing_arcsec=1.4, measured_fwhm_arcsec=1.9, of=2),
        Amendment(of=2, with_n=3, extra={"credit": 0.4}),
    )
    state = fold(events)
    assert [m.zenith_arcsec for m in state.seeing] == [1.4]
    assert state.exposures[0].credit == 0.4
    assert last_undoable(state) == events[2]
    undone = state.after(Amendment(of=3, withdrawn=True).stamped(5, at(5)))
    assert undone.seeing == ()
    assert undone.exposures[0].credit == 0.9
    assert undone.withdrawn == {3, 4}


def test_a_run_counts_what_was_taken() -> None:
    """Good and rejected exposures fill its steps in order; a stopped one does not."""
    run = RunStart(target="KR 12", filters=("B", "V"), seconds=(60.0, 30.0), counts=(2, 1))
    state = state_of(
        run,
        start(run=1),
        record(2, run=1),
        start(run=1),
        record(4, run=1, outcome="stopped"),
        start(run=1, filter="V"),
        record(6, run=1, filter="V", outcome="rejected"),
    )
    assert state.run is not None
    assert [step.taken for step in state.run.steps] == [1, 1]
    assert state.after(RunStop(of=1, why="finished").stamped(8, at(8))).run is None


def test_an_open_exposure_outlives_a_close_and_gives_way_to_the_next() -> None:
    """Until it has its record it is under way; a close changes nothing of that."""
    events = numbered(start(), Close(), start(filter="V"), record(1), record(3))
    assert fold(events[:2]).exposing == events[0]
    assert fold(events[:2]).closed
    assert not fold(events[:3]).closed
    assert fold(events[:4]).exposing == events[2]
    assert fold(events).exposing is None
    assert len(fold(events).exposures) == 2


def test_lost_time_has_a_cause_and_an_end() -> None:
    """A second beginning ends the first; an end without a beginning is nothing."""
    state = state_of(
        LostTime(phase="end"),
        LostTime(phase="begin", cause="cloud"),
        LostTime(phase="begin", cause="wind"),
    )
    assert [(each.cause, each.end_mjd) for each in state.lost] == [("cloud", at(3)), ("wind", None)]
    assert state.lost_since == state.lost[1]


def test_conditions_keep_the_latest_of_each_quantity() -> None:
    """What was not entered again still holds, with the time it was entered."""
    state = state_of(
        Conditions(cloud_percent=10.0, wind_m_per_s=3.0), Conditions(cloud_percent=60.0)
    )
    cloud, wind = state.latest("cloud_percent"), state.latest("wind_m_per_s")
    assert cloud is not None
    assert wind is not None
    assert (cloud.value, cloud.mjd) == (60.0, at(2))
    assert (wind.value, wind.mjd) == (3.0, at(1))
    assert state.latest("humidity_percent") is None


def test_a_seeing_is_of_when_it_was_seen() -> None:
    """Of the middle of the exposure it was measured on; of its entry when typed as such."""
    state = state_of(
        start(),
        record(1),
        Note(text="a while later"),
        Conditions(seeing_arcsec=1.4, measured_fwhm_arcsec=1.8, of=2),
        Conditions(seeing_arcsec=1.2),
        Conditions(seeing_arcsec=1.3, of=99),
    )
    exposure = state.exposures[0]
    assert exposure.mid_mjd < at(3)
    assert [each.mjd for each in state.seeing] == [exposure.mid_mjd, at(5), at(6)]


def test_undo_reaches_for_the_observers_entries_only() -> None:
    """What the console wrote by itself can't be undone, nor can an exposure that was taken."""
    events = numbered(
        Note(text="first"),
        start(),
        record(2),
        OrderProposed(targets=("KR 12",), starts_mjd=(at(1),)),
        Recovery(offset=1, removed_bytes=1, set_aside="x"),
        ClockStep(seconds=-3.0),
        Close(),
    )
    assert last_undoable(fold(events)) == events[0]
    more = [*events, Override(action="drop", target="KR 3").stamped(8, at(8))]
    assert last_undoable(fold(more)) == more[-1]
    assert last_undoable(NightState()) is None


def test_a_run_that_was_exposed_stands() -> None:
    """Its exposures are in the log; what is undone is the entry before it."""
    before = (
        Note(text="first"),
        Pointing(target="KR 12", on_target=True),
        RunStart(target="KR 12", filters=("B",), seconds=(120.0,), counts=(2,)),
        start(),
    )
    events = numbered(*before)
    assert last_undoable(fold(events)) == events[2]
    events = numbered(*before, record(4), RunStop(of=3, why="finished"))
    assert last_undoable(fold(events)) == events[0]
    events = numbered(*before, record(4), Pointing(target="KR 3"))
    assert last_undoable(fold(events)) == events[-1]


def test_a_rejection_can_be_undone() -> None:
    """Rejecting is an amendment of the observer's: withdrawn, the exposure counts again."""
    events = numbered(start(), record(1), Amendment(of=2, extra={"outcome": "rejected"}))
    state = fold(events)
    assert state.kept == ()
    assert last_undoable(state) == events[2]
    assert len(state.after(Amendment(of=3, withdrawn=True).stamped(4, at(4))).kept) == 1


def test_pointing_order_and_overrides_are_the_last_that_stand() -> None:
    """A withdrawn pointing gives back the one before it."""
    state = state_of(
        Pointing(target="KR 1"),
        Pointing(target="KR 2"),
        Override(action="drop", target="KR 9"),
        OrderProposed(targets=("KR 4",), starts_mjd=(at(9),), value=3.0),
        Amendment(of=2, withdrawn=True),
    )
    assert state.pointing is not None
    assert state.pointing.target == "KR 1"
    assert [each.target for each in state.overrides] == ["KR 9"]
    assert state.order is not None
    assert state.order.starts_mjd == (at(9),)
    found = state.event(2)
    assert isinstance(found, Pointing)
    assert found.target == "KR 2"
    assert state.event(77) is None
