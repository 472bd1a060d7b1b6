"""Every key of the table, pressed at every stage of the round and size of screen: never a fault."""

from __future__ import annotations

from pathlib import Path

import pytest

from tests.tui.trial import Trial, a_logbook, play
from tui.console.actions import ACTIONS

STAGES = {
    "idle": (),
    "moving": ("space",),
    "ready": ("space", "space"),
    "between": ("space", "space", "space"),
    "lost": ("l", "c"),
}


@pytest.mark.parametrize("size", [(80, 24), (160, 50)])
@pytest.mark.parametrize("stage", STAGES)
def test_every_key(tmp_path: Path, stage: str, size: tuple[int, int]) -> None:
    """Press each key, put aside what it asks, and find the console alive and its log whole."""

    async def story(trial: Trial) -> None:
        await trial.press(*STAGES[stage])
        for action in ACTIONS:
            if action.name == "leave":
                continue
            for key in action.keys:
                await trial.pilot.press(key)
                await trial.pilot.pause()
                await trial.pilot.press("escape")
                await trial.pilot.pause()
                assert trial.console.is_running
        await trial.settle()
        numbers = [event.n for event in trial.watch.state.events]
        assert numbers == list(range(1, len(numbers) + 1))
        assert "Kestrel Ridge" in trial.text("head")

    play(a_logbook(tmp_path / "nights"), story, size=size)
