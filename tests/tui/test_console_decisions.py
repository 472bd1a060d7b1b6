"""Stories of an observer who decides otherwise: pins, a hold, a target that can't wait."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.tui.trial import Trial, a_logbook, play


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    return a_logbook(tmp_path / "nights")


def turn(trial: Trial) -> list[str]:
    """Return the targets of the order ahead, in their turn."""
    assert trial.watch.plan is not None
    return [visit.target for visit in trial.watch.plan.order.visits]


def test_a_target_that_cannot_wait_comes_in_by_its_coordinates(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        await trial.press("i")
        typed = "072934-311700 R:60x5 Bright Guest"
        # Under ten seconds of typing at four keys a second.
        assert len(typed) < 40
        await trial.type(typed)
        assert "Bright Guest" in turn(trial)
        assert "Bright Guest" in trial.text("list")
        added = trial.watch.state.added[-1]
        assert added.counts == (5,)
        assert added.ra_deg == pytest.approx(112.39167, abs=1e-4)
        assert added.dec_deg == pytest.approx(-31.28333, abs=1e-4)
        # The cursor is on it: enter takes it, and its run is like any other.
        await trial.press("enter", "space", "space")
        await trial.wait(10.0)
        assert trial.watch.state.exposing is not None
        assert trial.watch.state.exposing.target == "Bright Guest"
        await trial.wait(61.0)
        assert trial.watch.state.kept[0].airmass_mid is not None

    play(folder, story)

    async def again(trial: Trial) -> None:
        # Taken up again, the night still has it, and what was done on it.
        assert trial.watch.plans()["Bright Guest"][0].done == 1

    play(folder, again)


def test_wrong_coordinates_stay_in_the_field(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        await trial.press("i")
        await trial.type("072934 311700 R:60x5")
        assert "with its sign" in trial.text("entry")
        assert "072934 311700" in trial.text("entry")
        await trial.press("escape")
        await trial.press("i")
        await trial.type("072934-311700 R:60x5 Sharp One")
        assert "called Sharp One already" in trial.text("notices")
        assert not trial.watch.state.added

    play(folder, story)


def test_an_added_target_can_be_undone(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        await trial.press("i")
        await trial.type("072934-311700 R:60x5 Guest")
        await trial.press("u")
        assert "Guest" not in turn(trial)
        assert "Guest" not in trial.text("list")

    play(folder, story)


def test_a_pin_puts_a_target_next_and_takes_itself_back(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        assert turn(trial)[0] != "Blunt"
        trial.console.query_one("#list").move_to("Blunt")  # type: ignore[attr-defined]
        await trial.press("b")
        assert turn(trial)[0] == "Blunt"
        await trial.press("b")
        assert turn(trial)[0] != "Blunt"
        assert "Blunt" in turn(trial)

    play(folder, story)


def test_a_pin_to_a_time_is_kept_to_the_minute(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        trial.console.query_one("#list").move_to("Blunt")  # type: ignore[attr-defined]
        await trial.press("t")
        await trial.type("2230")
        plan = trial.watch.plan
        assert plan is not None
        visit = next(each for each in plan.order.visits if each.target == "Blunt")
        # 22:30 in Sydney in March, on daylight time, is 11:30 UTC.
        first = visit.exposures[0].start_mjd
        assert (first - int(first)) * 24.0 == pytest.approx(11.5, abs=1.0 / 60.0)

    play(folder, story)


def test_a_time_that_is_past_is_refused(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        await trial.press("t")
        await trial.type("19:00")
        assert "past" in trial.text("notices")
        assert not trial.watch.state.overrides
        await trial.press("t")
        await trial.type("25:00")
        assert "expected a local time" in trial.text("entry")
        await trial.press("escape")

    play(folder, story)


def test_what_is_held_keeps_the_telescope_until_its_plan_is_done(folder: Path) -> None:
    async def story(trial: Trial) -> None:
        trial.console.query_one("#list").move_to("Blunt")  # type: ignore[attr-defined]
        await trial.press("enter", "space", "h")
        plan = trial.watch.plan
        assert plan is not None
        first = plan.order.visits[0]
        assert first.target == "Blunt"
        assert sum(placed.count for placed in first.exposures) == 3
        await trial.press("h")
        assert not trial.watch.state.overrides or (
            trial.watch.state.overrides[-1].action == "release"
        )

    play(folder, story)
