"""The watch over a night: plans while the list changes, proposals taken late, leaving."""

from __future__ import annotations

from pathlib import Path

import pytest

from engine.clock import HandClock, SystemClock
from engine.errors import NotNow
from engine.log import Close, Conditions
from engine.logbook import load_logbook, typed_target
from engine.rehearsal import NIGHT
from engine.watch import Stage, Watch, acts, open_watch, order_of_night, snapshot
from engine.watch.onlooker import open_onlooker
from tests.engine.watch_nights import a_console, evening_clock, plan, small_logbook


def ahead(watch: Watch) -> set[str]:
    """Return the targets of the order in force."""
    assert watch.plan is not None
    return {visit.target for visit in watch.plan.order.visits}


def test_a_target_that_may_be_observed_at_once_comes_into_the_plan_and_leaves_it(
    tmp_path: Path,
) -> None:
    """Its news is told against a plan whose tables have no such target."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        acts.insert(watch, typed_target("06:40:00 -31:00:00 V:60x5 New One", ["V"]))
        plan(watch)
        assert "New One" in ahead(watch)
        assert watch.plan is not None
        assert "taken in: New One" in watch.plan.news
        acts.undo(watch)
        plan(watch)
        assert ahead(watch) == {"Near", "Far"}


def test_the_order_of_a_past_night_does_not_count_what_it_was_yet_to_take(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Asked a week later, from its beginning: then the plan was still to be done."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        acts.point_at(watch, "Near")
        acts.arrive(watch)
        plan(watch)
        acts.start_run(watch, watch.plans()["Near"])
        for _ in range(60):
            clock.advance_s(5.0)
            watch.tick()
        assert watch.stage is Stage.READY
        assert not any(line.remaining for line in watch.plans()["Near"])
    later_mjd = clock.now_mjd() + 7.0
    monkeypatch.setattr(SystemClock, "now_mjd", lambda self: later_mjd)
    logbook = load_logbook(folder)

    def targets(at_mjd: float | None) -> set[str]:
        order = order_of_night(logbook, NIGHT, at_mjd, None)
        return {visit.target for visit in order.visits}

    assert targets(None) == {"Near", "Far"}
    assert targets(clock.now_mjd()) == {"Far"}


def test_air_that_was_typed_wrongly_and_undone_is_forgotten(tmp_path: Path) -> None:
    """And air that was typed long ago."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:

        def temperature_c() -> float:
            # The air alone asks for no plan: the observer's next decision does.
            acts.drop(watch, "Far")
            plan(watch)
            return watch.planner.night.air.temperature_c

        standard_c = temperature_c()
        acts.conditions(watch, Conditions(temperature_c=-25.0))
        assert temperature_c() == -25.0
        acts.undo(watch)
        acts.undo(watch)
        assert temperature_c() == standard_c
        acts.conditions(watch, Conditions(temperature_c=-25.0))
        clock.advance_s(3.9 * 3600.0)
        assert temperature_c() == -25.0
        clock.advance_s(0.2 * 3600.0)
        assert temperature_c() == standard_c


def test_who_only_asks_sees_what_the_console_sees(tmp_path: Path) -> None:
    """The air that was typed, what was dropped, the seeing: all of it is in the log."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        acts.conditions(watch, Conditions(temperature_c=-25.0, pressure_hpa=780.0))
        acts.zenith_seeing(watch, 2.5)
        acts.drop(watch, "Far")
        plan(watch)
        clock.advance_s(60.0)
        assert watch.plan is not None
        shown = {each.target.name: each for each in watch.targets_now()}
        seeing_arcsec = float(watch.plan.forecast.at(clock.now_mjd())[0])
    seen = snapshot(load_logbook(folder), clock.now_mjd(), None)
    assert seen.night.air.temperature_c == -25.0
    assert seen.seeing_arcsec == pytest.approx(seeing_arcsec, rel=0.01)
    for each in seen.targets:
        assert each.reasons == shown[each.target.name].reasons
        assert each.airmass == pytest.approx(shown[each.target.name].airmass, abs=0.01)
    assert [each.target.name for each in seen.targets if each.reasons] == ["Far"]


def test_a_filter_that_leaves_the_wheel_in_the_middle_of_its_run(tmp_path: Path) -> None:
    """The console was left for a moment to edit the files; what was exposed stays recorded."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        acts.point_at(watch, "Near")
        acts.arrive(watch)
        acts.start_run(watch, watch.plans()["Near"])
        for seconds in (7.0, 30.0):
            clock.advance_s(seconds)
            watch.tick()
        assert watch.stage is Stage.BETWEEN
    for name in ("observatory.toml", "targets.toml"):
        text = (folder / name).read_text()
        (folder / name).write_text(text.replace('"B"', '"Bessell B"'))
    with a_console(folder, clock) as watch:
        with pytest.raises(NotNow, match="B is no longer in the wheel"):
            acts.measured_fwhm(watch, 2.0)
        for seconds in (9.0, 30.0):
            clock.advance_s(seconds)
            watch.tick()
        assert [each.filter for each in watch.state.kept] == ["B", "B"]
        assert [each.credit is None for each in watch.state.kept] == [False, True]


def test_who_looks_on_has_a_plan_of_now_even_when_nothing_happens(tmp_path: Path) -> None:
    """The sky turns for the onlooker too; a plan in force for ten minutes is made anew."""
    folder = small_logbook(tmp_path)
    with a_console(folder, evening_clock(folder)) as watch:
        acts.zenith_seeing(watch, 1.1)
    onlooker = open_onlooker(folder, NIGHT).watch
    hand = onlooker.clock
    assert isinstance(hand, HandClock)
    plan(onlooker)
    assert onlooker.state == watch.state
    onlooker.tick()
    assert onlooker.planning() is None
    hand.advance_s(11.0 * 60.0)
    onlooker.tick()
    plan(onlooker)
    assert onlooker.plan is not None
    assert onlooker.plan.made_mjd == hand.now_mjd()
    with pytest.raises(NotNow, match="looks on"):
        acts.note(onlooker, "not mine")


def test_a_night_is_closed_once(tmp_path: Path) -> None:
    """A signal that comes while the console is being left finds nothing more to do."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    watch = open_watch(folder, clock, ("A. Tester",), NIGHT).watch
    assert watch.close("left by the observer") is None
    assert watch.close("the terminal is gone") is None
    (close,) = [event for event in watch.state.events if isinstance(event, Close)]
    assert close.why == "left by the observer"


def test_the_proposal_is_the_first_visit_that_is_not_over(tmp_path: Path) -> None:
    """Who accepts it late, when the plan's first visit has gone by, has chosen nothing instead."""
    folder = small_logbook(tmp_path)
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        assert watch.plan is not None
        first, second = watch.plan.order.visits[:2]
        clock.set_mjd(0.5 * (first.end_mjd + second.end_mjd))
        assert watch.plan.ahead(clock.now_mjd())[0] == second
        acts.point_at(watch, second.target)
        assert not watch.state.overrides
        acts.point_at(watch, first.target)
        assert watch.state.overrides[-1].instead_of == second.target
