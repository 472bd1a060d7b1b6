"""The demo's lesson, done by the keys it names."""

from __future__ import annotations

from pathlib import Path

from tests.tui.trial import Trial, a_logbook, play
from tui.console.keys import Keys
from tui.console.lesson import AGAIN_TICKS, STEPS, Lesson


def test_every_line_is_done_by_the_key_it_names(tmp_path: Path) -> None:
    """Key by key: each line is told once, the next when it was done, and at the end an end."""
    lesson = Lesson(Keys())

    async def story(trial: Trial) -> None:
        def told() -> str:
            return " ".join(lesson.tick(trial.watch))

        assert told().startswith("LESSON 1 of 8: space")
        assert told() == ""
        await trial.press("space")
        assert told().startswith("LESSON 2")
        await trial.press("space")
        assert told().startswith("LESSON 3")
        await trial.press("space")
        await trial.wait(10.0)
        assert told().startswith("LESSON 4 of 8: f ")
        await trial.wait(240.0)
        await trial.press("f")
        await trial.type("1.8")
        assert told().startswith("LESSON 5 of 8: z ")
        await trial.press("z")
        await trial.type("3.5")
        assert told().startswith("LESSON 6 of 8: u ")
        await trial.press("u")
        # The seeing that was typed is withdrawn, so that line 5 would not hold any more.
        assert told().startswith("LESSON 7 of 8: d ")
        await trial.press("d")
        assert told().startswith("LESSON 8 of 8: l ")
        await trial.press("l", "c")
        assert told().startswith("That is the round.")
        assert told() == ""

    play(a_logbook(tmp_path / "nights"), story)


def test_a_line_is_told_again_after_a_while(tmp_path: Path) -> None:
    """Who was away has it before her when she comes back."""
    lesson = Lesson(Keys())

    async def story(trial: Trial) -> None:
        told = [lesson.tick(trial.watch) for _ in range(3 * AGAIN_TICKS)]
        assert sum(bool(each) for each in told) == 4
        assert len(STEPS) == 8

    play(a_logbook(tmp_path / "nights"), story)
