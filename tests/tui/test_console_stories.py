"""Stories of a night at the console, by keyboard: what happens, and what the screen says of it."""

from __future__ import annotations

import shutil
from pathlib import Path

import pytest

from engine.clock import HandClock
from engine.log import Amendment, Conditions, Note, read_log
from engine.logbook import sample_logbook
from engine.rehearsal import NIGHT
from engine.watch import Stage
from tests.tui.trial import Trial, a_logbook, after_dusk_mjd, play
from tui.widgets import LiveList


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook."""
    return a_logbook(tmp_path / "nights")


async def start(trial: Trial) -> None:
    """Go to the proposed target and start its run; the wheel turns first."""
    await trial.press("space", "space", "space")
    assert "STARTS IN" in trial.text("under-way")
    await trial.wait(10.0)
    assert trial.watch.stage is Stage.EXPOSING


async def run_first_target(trial: Trial) -> None:
    """Go to the proposed target and take the whole of its run."""
    await start(trial)
    for _ in range(200):
        if trial.watch.stage is Stage.READY:
            return
        await trial.wait(60.0)
    raise AssertionError("the run never ended")


def test_the_common_round_is_one_key_a_step(folder: Path) -> None:
    """Space accepts, says on target, starts the run; the run counts itself and ends."""

    async def story(trial: Trial) -> None:
        proposed = trial.watch.plan.order.visits[0].target if trial.watch.plan else ""
        assert f"NEXT  {proposed}" in trial.text("under-way")
        await trial.press("space")
        assert f"MOVING TO  {proposed}" in trial.text("under-way")
        assert "on target" in trial.text("foot")
        await trial.press("space")
        assert f"ON TARGET  {proposed}" in trial.text("under-way")
        await trial.press("space")
        await trial.wait(10.0)
        assert "EXPOSING" in trial.text("under-way")
        assert trial.watch.state.exposing is not None
        while trial.watch.stage is not Stage.READY:
            await trial.wait(120.0)
        plan = trial.watch.plans()[proposed]
        assert all(line.done == line.planned for line in plan)
        assert "its plan is finished" in trial.text("under-way")

    play(folder, story)


def test_a_number_that_can_not_be_is_kept_in_the_field(folder: Path) -> None:
    """A wrong answer says what was expected, beside what was typed; escape leaves."""

    async def story(trial: Trial) -> None:
        await trial.press("z")
        await trial.type("99")
        assert "expected 0.1 to 20 arcsec" in trial.text("entry")
        assert "99" in trial.text("entry")
        assert not trial.watch.state.seeing
        await trial.press("backspace", "backspace")
        await trial.type("1,9")
        assert [each.zenith_arcsec for each in trial.watch.state.seeing] == [1.9]
        await trial.press("z", "escape")
        assert not trial.console.query_one("#entry").display

    play(folder, story)


def test_worse_seeing_changes_the_order_and_says_why(folder: Path) -> None:
    """Sizes and order change at once, the limit is named, and undo brings the old ones back."""

    def state_of(trial: Trial, name: str) -> tuple[list[str], list[str]]:
        """Return the order's targets, and why one of them may not be observed now."""
        assert trial.watch.plan is not None
        (now,) = (each for each in trial.watch.targets_now() if each.target.name == name)
        targets = [visit.target for visit in trial.watch.plan.order.visits]
        return targets, [reason.code for reason in now.reasons]

    async def story(trial: Trial) -> None:
        before, reasons = state_of(trial, "Sharp Two")
        assert "Sharp Two" in before
        assert reasons == []
        await trial.press("z")
        await trial.type("4.5")
        after, reasons = state_of(trial, "Sharp Two")
        assert after[0] != "Sharp Two"
        assert reasons == ["too_soft"]
        assert "too soft now: Sharp Two" in trial.text("notices")
        await trial.press("u")
        again, reasons = state_of(trial, "Sharp Two")
        assert "Sharp Two" in again
        assert reasons == []
        assert not trial.watch.state.seeing
        amendments = [e for e in trial.watch.state.events if isinstance(e, Amendment)]
        assert [each.withdrawn for each in amendments] == [True]

    play(folder, story)


def test_a_measured_fwhm_becomes_zenith_seeing_and_credit(folder: Path) -> None:
    """The FWHM of the last frame gives the seeing, and the frame's own worth is worked out anew."""

    async def story(trial: Trial) -> None:
        await run_first_target(trial)
        last = trial.watch.state.exposures[-1]
        await trial.press("f")
        await trial.type("2.9")
        entered = [e for e in trial.watch.state.events if isinstance(e, Conditions)][-1]
        assert entered.measured_fwhm_arcsec == 2.9
        assert entered.of == last.n
        assert last.airmass_mid is not None
        assert entered.seeing_arcsec is not None
        back = trial.watch.planner.model.size_arcsec(
            trial.watch.planner.logbook.observatory.filter_index(last.filter),
            entered.seeing_arcsec,
            last.airmass_mid,
        )
        assert float(back) == pytest.approx(2.9, rel=2e-3)
        amended = trial.watch.state.exposures[-1]
        assert amended.measured_fwhm_arcsec == 2.9
        assert amended.credit is not None
        assert last.credit is not None
        assert amended.credit < last.credit
        await trial.press("u")
        assert trial.watch.state.exposures[-1].measured_fwhm_arcsec is None

    play(folder, story)


def test_a_rejected_exposure_comes_back_on_the_plan(folder: Path) -> None:
    """Rejecting needs a reason, counts down, and can be undone."""

    async def story(trial: Trial) -> None:
        await run_first_target(trial)
        name = trial.watch.state.exposures[-1].target
        done = sum(line.done for line in trial.watch.plans()[name])
        await trial.press("x")
        await trial.type("trailed")
        assert sum(line.done for line in trial.watch.plans()[name]) == done - 1
        await trial.press("u")
        assert sum(line.done for line in trial.watch.plans()[name]) == done

    play(folder, story)


def test_the_order_works_around_the_observers_rules(folder: Path) -> None:
    """Drop, put off, a filter put aside: each leaves the order and comes back."""

    async def story(trial: Trial) -> None:
        def ordered() -> list[str]:
            assert trial.watch.plan is not None
            return [visit.target for visit in trial.watch.plan.order.visits]

        first = ordered()[0]
        assert trial.console.query_one("#list", LiveList).key == first
        await trial.press("d")
        assert first not in ordered()
        assert any(
            each.target == first and "dropped" in each.reason
            for each in (trial.watch.plan.order.left_out if trial.watch.plan else ())
        )
        (dropped,) = (each for each in trial.watch.targets_now() if each.target.name == first)
        assert dropped.reasons[0].code == "dropped"
        trial.console.query_one("#list", LiveList).move_to(first)
        await trial.press("d")
        assert first in ordered()
        await trial.press("p")
        await trial.type("90")
        assert trial.watch.plan is not None
        begins = {visit.target: visit.start_mjd for visit in trial.watch.plan.order.visits}
        assert begins[first] >= trial.clock.now_mjd() + 80.0 / 1440.0
        await trial.press("w", "2")
        filters = {e.filter for v in trial.watch.plan.order.visits for e in v.exposures}
        assert "V" not in filters
        await trial.press("w", "2")
        filters = {e.filter for v in trial.watch.plan.order.visits for e in v.exposures}
        assert "V" in filters

    play(folder, story)


def test_lost_time_stops_the_run_and_ends_with_a_fresh_order(folder: Path) -> None:
    """A letter names the cause; the exposure is logged as stopped; space goes on."""

    async def story(trial: Trial) -> None:
        await start(trial)
        await trial.press("l", "c")
        assert trial.watch.stage is Stage.LOST
        assert "LOST TIME  cloud" in trial.text("under-way")
        assert trial.watch.state.exposures[-1].outcome == "stopped"
        await trial.wait(1500.0)
        await trial.press("space")
        (lost,) = trial.watch.state.lost
        assert lost.end_mjd is not None
        assert (lost.end_mjd - lost.begin_mjd) * 1440.0 == pytest.approx(25.0, abs=0.01)

    play(folder, story)


@pytest.mark.parametrize(("key", "outcome"), [("K", "good"), ("L", "cut_off")])
def test_an_exposure_cut_off_is_the_observers_to_judge(
    folder: Path, key: str, outcome: str
) -> None:
    """A console that comes back to an open exposure asks; K keeps it, L logs it as lost."""
    clock = HandClock(after_dusk_mjd(folder))

    async def dies(trial: Trial) -> None:
        await start(trial)

    async def comes_back(trial: Trial) -> None:
        assert trial.watch.stage is Stage.CUT_OFF
        assert "CUT OFF" in trial.text("under-way")
        await trial.press("space")
        assert trial.watch.stage is Stage.CUT_OFF
        await trial.press(key)
        assert trial.watch.state.exposures[-1].outcome == outcome
        await trial.wait(600.0)
        assert trial.watch.state.run is None

    play(folder, dies, clock=clock)
    clock.advance_s(3600.0)
    play(folder, comes_back, clock=clock)
    kinds = [event.kind for event in read_log(folder / f"{NIGHT.isoformat()}.toml").events]
    assert kinds.count("exposure") == 1


def test_a_note_and_conditions_reach_the_log_cleaned(folder: Path) -> None:
    """What is typed is shown and logged; what a terminal could obey is escaped first."""

    async def story(trial: Trial) -> None:
        await trial.press("n")
        trial.console.query_one("#entry").take_text("dome \x1b]0;x\x07 creaks \u202eback")  # type: ignore[attr-defined]
        await trial.press("enter")
        await trial.press("c", "w")
        await trial.type("13")
        assert "C A U T I O N" in trial.text("alarm")
        assert "wind 13 m/s" in trial.text("alarm")
        assert "the observatory's own rules decide" in trial.text("alarm")
        note = trial.watch.state.notes[-1].text
        assert "\x1b" not in note
        assert "\u202e" not in note
        assert note.startswith("dome")

    play(folder, story)


def test_a_defect_anywhere_is_told_and_survived(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A panel, the clockwork or a deed that raises is shown; the rest of the night goes on."""

    async def story(trial: Trial) -> None:
        def broken(*_: object) -> None:
            raise RuntimeError("a wheel came off")

        with monkeypatch.context() as patch:
            patch.setattr("tui.console.painting.paint_head", broken)
            await trial.wait(1.0)
            assert "a wheel came off" in trial.text("notices")
        with monkeypatch.context() as patch:
            patch.setattr("engine.watch.acts.point_at", broken)
            await trial.press("space")
            assert trial.watch.stage is Stage.IDLE
        with monkeypatch.context() as patch:
            patch.setattr(trial.watch, "tick", broken)
            await trial.wait(1.0)
        await start(trial)
        assert trial.watch.state.exposing is not None

    play(folder, story)


def test_leaving_while_exposing_asks(folder: Path) -> None:
    """Q asks while the shutter is open, and n stays."""

    async def story(trial: Trial) -> None:
        await start(trial)
        await trial.press("q")
        assert "leave all the same?" in trial.text("entry")
        await trial.press("n")
        assert trial.console.is_running
        assert trial.watch.stage is Stage.EXPOSING

    play(folder, story)


def test_a_log_that_can_not_be_written_is_saved_elsewhere(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Leaving with entries the disk refuses puts the whole night into the observer's home."""
    monkeypatch.setenv("HOME", str(tmp_path))
    told: list[str | None] = []

    async def story(trial: Trial) -> None:
        def refuse(*_: object) -> None:
            raise OSError(28, "No space left on device")

        await trial.press("space")
        with monkeypatch.context() as patch:
            patch.setattr("engine.log.worker.NightLog.append_block", refuse)
            patch.setattr("engine.log.worker.LogWorker.drain", lambda *_: False)
            await trial.press("n")
            await trial.type("the disk is full")
            await trial.wait(1.0)
            assert "can't be written" in trial.text("alarm")
            assert "LOG NOT WRITTEN: 1 waiting" in trial.text("head")
            told.append(trial.close())

    play(folder, story)
    (said,) = told
    assert said is not None
    (saved,) = tmp_path.glob("*.rescued*")
    assert str(saved) in said
    saved = saved.rename(tmp_path / f"{NIGHT.isoformat()}.toml")
    events = read_log(saved).events
    assert any(isinstance(each, Note) and each.text == "the disk is full" for each in events)


def test_a_plan_that_fails_is_told_and_survived(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """When the planner raises, the night goes on with the last good order."""

    async def story(trial: Trial) -> None:
        def broken(*_: object) -> None:
            raise RuntimeError("no such sky")

        order = trial.watch.plan
        monkeypatch.setattr(trial.watch.planner, "plan", broken)
        await trial.press("z")
        await trial.type("2.0")
        assert "planning failed" in trial.text("notices")
        assert trial.watch.plan is order
        await trial.press("space")
        assert trial.watch.stage is Stage.MOVING

    play(folder, story)


@pytest.mark.parametrize("size", [(80, 24), (120, 40), (160, 50)])
def test_nothing_is_cut_short(tmp_path: Path, size: tuple[int, int]) -> None:
    """With the sample's long names and plans no panel, row or foot ends in an ellipsis."""
    folder = tmp_path / "sample"
    shutil.copytree(sample_logbook(), folder)

    async def story(trial: Trial) -> None:
        for _ in range(5):
            await trial.press("tab")
            for _ in range(3):
                await trial.press("j")
                cut = [each for each in trial.screen().splitlines() if "…" in each]
                assert not cut

    play(folder, story, size=size)


def test_what_is_next_comes_after_the_run_that_goes_on(folder: Path) -> None:
    """While a target is exposed, another place of it in the order is no news."""

    async def story(trial: Trial) -> None:
        await start(trial)
        assert trial.watch.state.exposing is not None
        here = trial.watch.state.exposing.target
        for value in ("1.1", "4.5", "1.1"):
            await trial.press("z")
            await trial.type(value)
            assert trial.watch.stage is Stage.EXPOSING
            said = [each.text for each in trial.console.notices]
            assert not any(f"next {here}" in each for each in said)
            assert not any(f"instead of {here}" in each for each in said)

    play(folder, story)
