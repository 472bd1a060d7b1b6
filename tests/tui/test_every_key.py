"""Every key of the table, in every view and at every stage of the round: never a fault."""

from __future__ import annotations

import asyncio
import logging
from pathlib import Path

import pytest
from textual.events import Key

from tests.tui.trial import Trial, a_logbook, play
from tui.console.actions import ACTIONS, MOVES
from tui.console.views import NIGHT, VIEWS

STAGES = {
    "idle": (),
    "moving": ("space",),
    "ready": ("space", "space"),
    "between": ("space", "space", "space"),
    "lost": ("l", "c"),
}
SIZES = [(80, 24), (160, 50)]
KEYS = [key for action in ACTIONS if action.name != "leave" for key in action.keys]


async def send(trial: Trial, key: str) -> None:
    """Hand the console one key where Textual hands it; the pilot would wait long after each."""
    await trial.console.on_event(Key(key, key if len(key) == 1 else None))
    await asyncio.sleep(0.0)


async def press_every_key(trial: Trial, view: str) -> None:
    """Press each key in a view, put aside what it asks, and find the console alive."""
    key_of_view = next(each.key for each in VIEWS if each.name == view)
    for key in (*KEYS, *MOVES, "left", "right"):
        await send(trial, key_of_view)
        assert trial.console.view == view
        await send(trial, key)
        if len(trial.console.screen_stack) > 1:
            await trial.pilot.press("escape")
        else:
            await send(trial, "escape")
        assert trial.console.is_running


def check_nothing_failed(trial: Trial, caplog: pytest.LogCaptureFixture) -> None:
    """Find no defect written down, and the log whole."""
    assert not [each for each in caplog.records if each.levelno >= logging.ERROR]
    numbers = [event.n for event in trial.watch.state.events]
    assert numbers == list(range(1, len(numbers) + 1))
    assert "Kestrel Ridge" in trial.text("head")


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("stage", STAGES)
def test_every_key(
    tmp_path: Path, caplog: pytest.LogCaptureFixture, stage: str, size: tuple[int, int]
) -> None:
    """At every stage of the round."""

    async def story(trial: Trial) -> None:
        await trial.press(*STAGES[stage])
        await press_every_key(trial, NIGHT)
        await trial.settle()
        check_nothing_failed(trial, caplog)

    play(a_logbook(tmp_path / "nights"), story, size=size)


@pytest.mark.parametrize("view", [each.name for each in VIEWS if each.name != NIGHT])
def test_every_key_in_every_view(
    tmp_path: Path, caplog: pytest.LogCaptureFixture, view: str
) -> None:
    """While an exposure goes on, with something measured, on the smallest screen."""

    async def story(trial: Trial) -> None:
        await trial.press("z")
        await trial.type("2.4")
        await trial.press("space", "space", "space")
        await trial.wait(10.0)
        await press_every_key(trial, view)
        await trial.settle()
        check_nothing_failed(trial, caplog)

    play(a_logbook(tmp_path / "nights"), story, size=SIZES[0])
