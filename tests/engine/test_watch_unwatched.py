"""What nobody watched is not counted: consoles that were away, computers that slept."""

from __future__ import annotations

from pathlib import Path

import pytest

from engine.clock import HandClock
from engine.log import ClockStep
from engine.watch import Stage, Watch, acts
from engine.watch.watch import UNWATCHED
from tests.engine.watch_nights import a_console, evening_clock, plan, small_logbook

# The camera's readout and the turn of the wheel to B, and a second more.
STARTS_S, EXPOSURE_S, READS_S = 7.0, 30.0, 9.0


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook."""
    return small_logbook(tmp_path)


@pytest.fixture
def clock(folder: Path) -> HandClock:
    """Return a clock in its evening."""
    return evening_clock(folder)


def pass_s(watch: Watch, clock: HandClock, seconds: float) -> None:
    """Let time pass, and the watch see it."""
    clock.advance_s(seconds)
    watch.tick()


def begin_run(watch: Watch, clock: HandClock) -> None:
    """Point, arrive, start the run, and wait until the shutter is open."""
    acts.point_at(watch, "Near")
    acts.arrive(watch)
    plan(watch)
    acts.start_run(watch, acts.lines_now(watch))
    pass_s(watch, clock, STARTS_S)
    assert watch.stage is Stage.EXPOSING


def outcomes(watch: Watch) -> list[str]:
    """Return the outcomes of the exposures that are recorded."""
    return [each.outcome for each in watch.state.exposures]


def why_the_run_ended(watch: Watch) -> str:
    """Return why the last run ended."""
    stops = [event for event in watch.state.events if event.kind == "run_stop"]
    return str(getattr(stops[-1], "why", ""))


def test_a_run_between_exposures_is_not_counted_on_while_the_console_is_away(
    folder: Path, clock: HandClock
) -> None:
    with a_console(folder, clock) as watch:
        begin_run(watch, clock)
        pass_s(watch, clock, EXPOSURE_S)
        assert watch.stage is Stage.BETWEEN
    clock.advance_s(3600.0)
    with a_console(folder, clock) as watch:
        pass_s(watch, clock, 0.5)
        assert outcomes(watch) == ["good"]
        assert watch.stage is Stage.READY
        assert why_the_run_ended(watch) == UNWATCHED


def test_a_run_goes_on_when_the_console_is_back_before_its_next_exposure(
    folder: Path, clock: HandClock
) -> None:
    with a_console(folder, clock) as watch:
        begin_run(watch, clock)
        pass_s(watch, clock, EXPOSURE_S)
    clock.advance_s(2.0)
    with a_console(folder, clock) as watch:
        pass_s(watch, clock, READS_S)
        assert watch.stage is Stage.EXPOSING


def test_keeping_an_exposure_vouches_for_no_other(folder: Path, clock: HandClock) -> None:
    with a_console(folder, clock) as watch:
        begin_run(watch, clock)
    clock.advance_s(10.0)
    with a_console(folder, clock) as watch:
        # It is asked for in time and answered late.
        pass_s(watch, clock, 600.0)
        acts.keep_cut_off(watch)
        pass_s(watch, clock, 600.0)
        assert outcomes(watch) == ["good"]
        assert why_the_run_ended(watch) == UNWATCHED


def test_keeping_an_exposure_that_still_runs_lets_its_run_go_on(
    folder: Path, clock: HandClock
) -> None:
    with a_console(folder, clock) as watch:
        begin_run(watch, clock)
    clock.advance_s(10.0)
    with a_console(folder, clock) as watch:
        acts.keep_cut_off(watch)
        pass_s(watch, clock, EXPOSURE_S)
        pass_s(watch, clock, READS_S)
        assert outcomes(watch) == ["good"]
        assert watch.stage is Stage.EXPOSING


def test_an_exposure_that_the_computer_slept_over_is_the_observers_to_judge(
    folder: Path, clock: HandClock
) -> None:
    with a_console(folder, clock) as watch:
        begin_run(watch, clock)
        clock.advance_s(3600.0)
        watch.submit(ClockStep(seconds=3600.0, why="it slept"))
        watch.tick()
        assert watch.stage is Stage.CUT_OFF
        acts.lose_cut_off(watch)
        assert outcomes(watch) == ["cut_off"]


def test_an_exposure_outlives_a_small_step_of_the_clock(folder: Path, clock: HandClock) -> None:
    with a_console(folder, clock) as watch:
        begin_run(watch, clock)
        clock.advance_s(1.0)
        watch.submit(ClockStep(seconds=1.0, why="set"))
        pass_s(watch, clock, EXPOSURE_S)
        assert outcomes(watch) == ["good"]
