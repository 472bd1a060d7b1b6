"""The observer's decisions, as the order is told of them."""

from __future__ import annotations

from engine.log import Amendment, Event, NightState, Override, Pointing, RunStart, RunStop, fold
from engine.watch.rules import is_pinned, rules_from

NOW_MJD = 61479.5


def after(*events: Event) -> NightState:
    """Return the state after events, a minute apart."""
    return fold(event.stamped(n, NOW_MJD + n / 1440.0) for n, event in enumerate(events, start=1))


def run_on(target: str) -> RunStart:
    """Return a run of two exposures."""
    return RunStart(target=target, filters=("V",), seconds=(60.0,), counts=(2,))


def test_a_pin_serves_once() -> None:
    pinned = after(Override(action="pin", target="A"))
    assert rules_from(pinned, NOW_MJD).first == "A"
    assert is_pinned(pinned, "A")
    begun = after(Override(action="pin", target="A"), Pointing(target="A"), run_on("A"))
    assert not is_pinned(begun, "A")
    over = after(
        Override(action="pin", target="A"), Pointing(target="A"), run_on("A"), RunStop(of=3, why="")
    )
    assert rules_from(over, NOW_MJD).first is None


def test_a_run_that_was_undone_leaves_the_pin() -> None:
    state = after(
        Override(action="pin", target="A"),
        Pointing(target="A"),
        run_on("A"),
        Amendment(of=3, withdrawn=True),
    )
    assert is_pinned(state, "A")


def test_a_pin_that_has_served_does_not_bring_back_the_drop_it_undid() -> None:
    state = after(
        Override(action="drop", target="A"),
        Override(action="pin", target="A"),
        Pointing(target="A"),
        run_on("A"),
    )
    assert not rules_from(state, NOW_MJD).dropped


def test_a_run_under_way_comes_before_a_pin() -> None:
    state = after(Pointing(target="B"), run_on("B"), Override(action="pin", target="A"))
    assert rules_from(state, NOW_MJD).first == "B"
    over = after(
        Pointing(target="B"), run_on("B"), Override(action="pin", target="A"), RunStop(of=2, why="")
    )
    assert rules_from(over, NOW_MJD).first == "A"


def test_a_pin_at_a_time_is_not_a_pin_to_be_next() -> None:
    at_mjd = NOW_MJD + 0.1
    rules = rules_from(after(Override(action="pin", target="A", at_mjd=at_mjd)), NOW_MJD)
    assert rules.first is None
    assert rules.pinned == {"A": at_mjd}


def test_what_is_held_is_held_until_the_telescope_goes_elsewhere() -> None:
    held = (Pointing(target="A"), Override(action="hold", target="A"))
    assert rules_from(after(*held), NOW_MJD) == rules_from(
        after(*held, run_on("A"), RunStop(of=3, why="")), NOW_MJD
    )
    assert rules_from(after(*held), NOW_MJD).hold
    left = after(*held, Pointing(target="B"))
    assert (rules_from(left, NOW_MJD).first, rules_from(left, NOW_MJD).hold) == ("B", False)


def test_a_later_decision_takes_the_place_of_an_earlier_one() -> None:
    until_mjd = NOW_MJD + 1.0
    decisions = (
        Override(action="drop", target="A"),
        Override(action="put_off", target="A", until_mjd=until_mjd),
        Override(action="pin", target="A"),
        Override(action="release", target="A"),
    )
    dropped, put_off, pinned, released = (
        rules_from(after(*decisions[:count]), NOW_MJD) for count in (1, 2, 3, 4)
    )
    assert dropped.dropped == {"A"}
    assert (put_off.dropped, put_off.put_off) == (frozenset(), {"A": until_mjd})
    assert (pinned.put_off, pinned.first) == ({}, "A")
    assert released == rules_from(after(), NOW_MJD)


def test_what_was_put_off_comes_back_when_its_time_is_over() -> None:
    state = after(Override(action="put_off", target="A", until_mjd=NOW_MJD))
    assert rules_from(state, NOW_MJD - 0.01).put_off
    assert not rules_from(state, NOW_MJD + 0.01).put_off
