"""Snapshots of screens as text files that a person can read: what every cell holds, and its style.

A file has the screen's text, then for each row the runs of its styles as letters, then what each
letter stands for. After a change that was meant:

    .venv/bin/python -m tests.tui.snapshots

writes them all anew; `git diff` shows what changed.
"""

from __future__ import annotations

import tempfile
from itertools import groupby
from pathlib import Path

from rich.segment import Segment
from rich.style import Style

from tests.tui.trial import Trial, a_logbook, play
from tui.console.views import VIEWS

FOLDER = Path(__file__).parent / "snapshots"
LOOKS_SHOWN = ("day", "red")
SIZES = ((80, 24), (160, 50))
_LETTERS = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789"


def screens() -> dict[str, str]:
    """Return a snapshot by its file's name, of each view in each look and size."""
    with tempfile.TemporaryDirectory() as folder:
        return {
            name: text
            for look in LOOKS_SHOWN
            for size in SIZES
            for name, text in _screens(Path(folder) / f"{look}{size[0]}", look, size).items()
        }


def _screens(folder: Path, look: str, size: tuple[int, int]) -> dict[str, str]:
    found: dict[str, str] = {}

    async def story(trial: Trial) -> None:
        await trial.press("z")
        await trial.type("2.1")
        await trial.press("c", "w")
        await trial.type("13")
        await trial.press("space", "space", "space")
        trial.clock.advance_s(10.0)
        trial.watch.tick()
        for entry in VIEWS:
            await trial.press(entry.key, "escape")
            await trial.settle()
            trial.console.paint()
            await trial.pilot.pause()
            found[f"{entry.name}-{look}-{size[0]}x{size[1]}.txt"] = written(trial)

    play(a_logbook(folder), story, size=size, look=look)
    return found


def written(trial: Trial) -> str:
    """Return the screen as text and styles."""
    strips = trial.console.screen._compositor.render_strips()
    rows = [list(strip) for strip in strips]
    styles: dict[str, str] = {}
    for row in rows:
        for segment in row:
            styles.setdefault(_told(segment.style), _LETTERS[len(styles) % len(_LETTERS)])
    text = ["".join(segment.text for segment in row).rstrip() for row in rows]
    runs = [_runs(row, styles) for row in rows]
    legend = [f"{letter}  {told}" for told, letter in styles.items()]
    return "\n".join([*text, "", "styles", *runs, "", *legend, ""])


def _runs(row: list[Segment], styles: dict[str, str]) -> str:
    letters = ((styles[_told(each.style)], len(each.text)) for each in row)
    return " ".join(
        f"{letter}{sum(length for _, length in run)}"
        for letter, run in groupby(letters, key=lambda pair: pair[0])
    )


def _told(style: Style | None) -> str:
    return str(style) if style is not None else "none"


def update() -> None:
    """Write every snapshot anew."""
    FOLDER.mkdir(exist_ok=True)
    for old in FOLDER.glob("*.txt"):
        old.unlink()
    for name, text in screens().items():
        (FOLDER / name).write_text(text, encoding="utf-8")
        print(f"tests/tui/snapshots/{name}")


if __name__ == "__main__":
    update()
