"""Alarms: raised once, shown until seen and over, none lost."""

from __future__ import annotations

from hypothesis import given
from hypothesis import strategies as st

from engine.watch.alarms import QUIET_MIN, Alarms, Cause

NOW_MJD = 61479.5
MINUTE = 1.0 / 1440.0
WIND = Cause("caution", "wind", "CAUTION", "wind 13 m/s")
DISK = Cause("disk", "", "LOG NOT WRITTEN", "disk full")
OVER = Cause("run_over", "7", "RUN OVER", "the run is finished", answers_itself=True)


def test_an_alarm_rings_once_and_waits_to_be_seen() -> None:
    """Also after its cause has gone: then it says that it was."""
    alarms = Alarms()
    assert alarms.update([WIND], NOW_MJD)
    assert not alarms.update([WIND], NOW_MJD + MINUTE)
    assert not alarms.update([], NOW_MJD + 2 * MINUTE)
    (waiting,) = alarms.waiting
    assert (waiting.cause, waiting.stands, waiting.since_mjd) == (WIND, False, NOW_MJD)
    assert alarms.acknowledge() == waiting
    assert alarms.waiting == ()
    assert alarms.acknowledge() is None


def test_alarms_are_seen_one_by_one_the_oldest_first() -> None:
    """Each needs a key of its own."""
    alarms = Alarms()
    alarms.update([DISK], NOW_MJD)
    assert alarms.update([WIND, DISK], NOW_MJD + MINUTE)
    assert [each.cause for each in alarms.waiting] == [DISK, WIND]
    alarms.acknowledge()
    assert [each.cause for each in alarms.waiting] == [WIND]


def test_one_that_was_seen_does_not_ring_for_a_value_that_wanders() -> None:
    """But does after it was quiet for a while."""
    alarms = Alarms()
    alarms.update([WIND], NOW_MJD)
    alarms.acknowledge()
    later = NOW_MJD
    for minute in range(1, 60):
        later = NOW_MJD + minute * MINUTE
        assert not alarms.update([WIND] if minute % 2 else [], later)
    quiet = later + (QUIET_MIN + 1.0) * MINUTE
    assert not alarms.update([], quiet)
    assert alarms.update([WIND], quiet + MINUTE)


def test_what_the_observer_answers_by_acting_goes_by_itself() -> None:
    """A run that is over is no alarm once the next thing was begun."""
    alarms = Alarms()
    alarms.update([OVER], NOW_MJD)
    alarms.update([], NOW_MJD + MINUTE)
    assert alarms.waiting == ()


@given(
    st.lists(
        st.tuples(st.sets(st.sampled_from([WIND, DISK]), max_size=2), st.booleans()), max_size=40
    )
)
def test_none_is_ever_lost(steps: list[tuple[set[Cause], bool]]) -> None:
    """Whatever comes and goes: one that was raised waits until it was acknowledged."""
    alarms = Alarms()
    waiting: set[Cause] = set()
    known: set[Cause] = set()
    for minute, (causes, sees) in enumerate(steps):
        now_mjd = NOW_MJD + minute * (QUIET_MIN + 1.0) * MINUTE
        gone = {each for each in known - causes if each not in waiting}
        known -= gone
        fresh = causes - known
        waiting |= fresh
        known |= causes
        assert alarms.update(sorted(causes, key=lambda each: each.code), now_mjd) == bool(fresh)
        assert {each.cause for each in alarms.waiting} == waiting
        if sees and (seen := alarms.acknowledge()):
            waiting.discard(seen.cause)
