"""The words of the log: registries, one line for each event, and steps of the clock."""

from __future__ import annotations

from itertools import pairwise

import pytest
from hypothesis import given, settings

from engine.clock import HandClock
from engine.log import (
    LOST_CAUSES,
    OUTCOMES,
    OVERRIDES,
    Amendment,
    Calibration,
    ClockStep,
    Close,
    Conditions,
    Event,
    Exposure,
    ExposureStart,
    Focus,
    LostTime,
    Note,
    OrderProposed,
    Override,
    Pointing,
    Recovery,
    RunStart,
    RunStop,
    StepWatch,
    title,
)
from engine.logbook.text import visible
from tests.engine.log_nights import any_event, at


@pytest.mark.parametrize("registry", [OUTCOMES, LOST_CAUSES, OVERRIDES])
def test_each_word_is_there_once_with_label_and_sentence(registry: tuple[object, ...]) -> None:
    """One frozen registry a vocabulary; labels differ, sentences are sentences."""
    values = [word.value for word in registry]  # type: ignore[attr-defined]
    labels = [word.label for word in registry]  # type: ignore[attr-defined]
    assert len(set(values)) == len(set(labels)) == len(registry) > 3
    for word in registry:
        assert word.sentence.endswith(".")  # type: ignore[attr-defined]


def test_the_causes_of_lost_time_differ_in_their_first_letters() -> None:
    """The console asks for one by its first letter."""
    assert len({cause.label[0] for cause in LOST_CAUSES}) == len(LOST_CAUSES)


EXPOSED = Exposure(
    of=1, target="KR 12", filter="B", seconds=120.0, exposed_s=120.0,
    start_mjd=at(0), mid_mjd=at(1), end_mjd=at(2), airmass_mid=1.234,
    image_size_arcsec=1.9, measured_fwhm_arcsec=2.0, credit=0.874, outcome="good",
)  # fmt: skip

TITLES: list[tuple[Event, str]] = [
    (EXPOSED, 'B 120 s on KR 12, airmass 1.23, 1.90" predicted, 2.00" measured, worth 0.87, good'),
    (
        Exposure(
            of=1, target="X", filter="V", seconds=9.5, exposed_s=2.0, start_mjd=0.0, mid_mjd=0.0,
            end_mjd=0.0, outcome="cut_off", why="the console ended",
        ),
        "V 9.5 s on X, cut off: the console ended",
    ),
    (ExposureStart(target="X", filter="V", seconds=60.0, start_mjd=0.0), "V 60 s on X begins"),
    (
        RunStart(target="X", filters=("B", "V"), seconds=(60.0, 30.0), counts=(3, 5)),
        "run on X: B 60 s × 3, V 30 s × 5",
    ),
    (RunStop(of=1, why="finished"), "run over: finished"),
    (Pointing(target="X"), "to X"),
    (Pointing(target="X", on_target=True), "on target X"),
    (
        Conditions(seeing_arcsec=1.5, wind_m_per_s=3.0, cloud_percent=20.0),
        'seeing 1.50", cloud 20 %, wind 3 m/s',
    ),
    (Conditions(), "conditions"),
    (LostTime(phase="begin", cause="cloud"), "lost time begins: cloud"),
    (LostTime(phase="end"), "lost time ends"),
    (Note(text="two\nlines"), "note: two lines"),
    (OrderProposed(targets=("X", "Y"), starts_mjd=(), why="dusk"), "order: X, Y: dusk"),
    (OrderProposed(targets=(), starts_mjd=()), "order: nothing"),
    (Override(action="chose", target="X", instead_of="Y"), "chose instead: X instead of Y"),
    (Override(action="forbid", filter="B", why="dusty"), "filter put aside: B: dusty"),
    (Amendment(of=4, withdrawn=True, why="undone"), "entry 4 withdrawn: undone"),
    (Amendment(of=4, extra={"outcome": "rejected"}), "entry 4 outcome = rejected"),
    (
        Focus(position=1234.0, fwhm_arcsec=1.8, temperature_c=7.5, filter="V"),
        'focus at 1234, V, FWHM 1.80", 7.5 °C',
    ),
    (Focus(), "focus"),
    (
        Calibration(what="flat", filter="B", seconds=5.0, count=10, level_adu=25_000.0),
        "calibration: flat B 5 s × 10 at 25000 adu",
    ),
    (ClockStep(seconds=-3.0), "the computer's clock jumped -3.0 s"),
    (Close(), "closed"),
    (
        Recovery(offset=9, removed_bytes=7, set_aside="x.torn-9"),
        "recovered: 7 torn bytes set aside in x.torn-9",
    ),
]  # fmt: skip


@pytest.mark.parametrize(("event", "line"), TITLES)
def test_an_event_is_one_plain_line(event: Event, line: str) -> None:
    """What the log view shows."""
    assert title(event) == line


@settings(max_examples=200, deadline=None)
@given(any_event())
def test_no_event_shows_anything_a_terminal_acts_on(event: Event) -> None:
    """Whatever text, number or time an event holds: one line, safe, not empty, not endless."""
    line = title(event)
    assert visible(line) == line
    assert 0 < len(line) <= 400


def step_watch(*moments: tuple[float, float]) -> list[ClockStep | None]:
    """Return what is said at each (clock, monotonic) pair of seconds after the first."""
    clock = HandClock(at(0))
    steady = iter([steady_s for _, steady_s in moments])
    watch = StepWatch(clock, lambda: next(steady))
    said = []
    for (before_s, _), (now_s, _) in pairwise(moments):
        clock.advance_s(now_s - before_s)
        said.append(watch.step())
    return said


def test_a_clock_that_runs_on_says_nothing() -> None:
    """Small drifts, slow calls, hours between: no step."""
    assert step_watch((0, 0), (1, 1), (60, 60.2), (7260, 7260.3)) == [None, None, None]


def test_a_step_is_said_once_with_its_size() -> None:
    """Back, then forward; each is an event, and afterwards all is well again."""
    back, none, forward = step_watch((0, 0), (-29, 1), (-28, 2), (3573, 3))
    assert back is not None
    assert back.seconds == pytest.approx(-30.0, abs=0.002)
    assert "back" in back.why
    assert none is None
    assert forward is not None
    assert forward.seconds == pytest.approx(3600.0, abs=0.002)
    assert "forward" in forward.why
