"""Stories of alarms: on every view, one key each, from the things that matter at night."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from engine.clock import HandClock
from engine.rehearsal import NIGHT
from engine.watch import open_watch
from engine.watch.alarms import causes_now
from tests.tui.trial import Trial, a_logbook, after_dusk_mjd, play


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook."""
    return a_logbook(tmp_path / "nights")


async def start(trial: Trial) -> None:
    """Begin the proposed run."""
    await trial.press("space", "space", "space")
    await trial.wait(10.0)


def test_each_alarm_is_seen_with_one_key(folder: Path) -> None:
    """Two cautions: one is shown, the other counted; a key a piece, and both are gone."""

    async def story(trial: Trial) -> None:
        for letter, value in (("w", "13"), ("h", "95")):
            await trial.press("c", letter)
            await trial.type(value)
        assert "1 more" in trial.text("alarm")
        await trial.press("2")
        assert "wind" in trial.text("alarm")
        await trial.press("a")
        assert "humidity" in trial.text("alarm")
        await trial.press("escape")
        assert "humidity" in trial.text("alarm")
        await trial.press("a")
        assert not trial.console.sheet("alarm").display
        await trial.press("a")
        assert "no alarm waits" in trial.text("notices")

    play(folder, story)


@pytest.mark.parametrize("size", [(80, 24), (160, 50)])
def test_a_run_that_is_over_is_told_until_the_next_thing_is_done(
    folder: Path, size: tuple[int, int]
) -> None:
    """And going on answers it: no key more than the round has."""

    async def story(trial: Trial) -> None:
        await start(trial)
        for _ in range(60):
            await trial.wait(60.0)
            if trial.watch.state.run is None:
                break
        said = trial.text("alarm")
        assert ("RUN OVER" if size[0] == 80 else "R U N   O V E R") in said
        await trial.press("space")
        assert "RUN OVER" not in trial.text("alarm").replace(" ", "")
        assert not trial.console.sheet("alarm").display

    play(folder, story, size=size)


def test_a_seeing_beyond_the_limit_of_what_is_exposed_is_an_alarm(folder: Path) -> None:
    """The target, the filter, its size and its limit."""

    async def story(trial: Trial) -> None:
        trial.console.query_one("#list").move_to("Sharp Two")  # type: ignore[attr-defined]
        await trial.press("enter", "space", "space")
        await trial.wait(10.0)
        await trial.press("z")
        await trial.type("4.5")
        assert "Sharp Two in V" in trial.text("alarm")
        assert 'its limit 2.60"' in trial.text("alarm")

    play(folder, story)


def test_an_old_seeing_is_an_alarm(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Exposing for long without a measurement."""
    monkeypatch.setattr("engine.watch.alarms.STALE_MIN", 20.0)

    async def story(trial: Trial) -> None:
        trial.console.query_one("#list").move_to("Blunt")  # type: ignore[attr-defined]
        await trial.press("enter", "space", "space")
        for _ in range(20):
            await trial.wait(120.0)
        assert "nothing measured yet" in trial.text("alarm")

    play(folder, story)


def test_the_end_of_the_dark_is_an_alarm(folder: Path) -> None:
    """Ten minutes before the last filter's dark ends, while something is exposed."""
    watch = open_watch(folder, HandClock(after_dusk_mjd(folder)), ("A. Tester",), NIGHT).watch
    dark = np.flatnonzero(watch.planner.night.dark.any(axis=0))
    last_mjd = float(watch.planner.night.mjd[dark[-1]])
    watch.close()

    async def story(trial: Trial) -> None:
        trial.console.query_one("#list").move_to("Blunt")  # type: ignore[attr-defined]
        await trial.press("enter", "space", "space")
        await trial.wait(10.0)
        said = trial.text("alarm")
        assert "D A W N" in said or "1 more" in said or "2 more" in said
        causes = {each.code for each in causes_now(trial.watch)}
        assert "dawn" in causes

    play(folder, story, clock=HandClock(last_mjd - 10.0 / 1440.0))
