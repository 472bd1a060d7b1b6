"""A small logbook and a console over it with a clock set by hand: for stories driven by Pilot."""

from __future__ import annotations

import asyncio
import shutil
from collections.abc import Awaitable, Callable
from pathlib import Path

from textual.pilot import Pilot

from engine.clock import HandClock
from engine.logbook import load_logbook, sample_logbook
from engine.positions import almanac
from engine.rehearsal import NIGHT
from engine.times import MINUTES_PER_DAY
from engine.watch import Watch, acts, open_watch
from tui.console.app import Console

# High in the evening of the rehearsal's night and off the meridian; the second has a limit that a
# seeing of 4.5 arcsec breaks.
TARGETS = """
[[programme]]
name = "Trial"

[[target]]
name = "Sharp One"
programme = "Trial"
ra = "06:29:34"
dec = "-31:17:00"
priority = 5
exposures = [ { filter = "B", seconds = 30, count = 2 }, { filter = "V", seconds = 20, count = 2 } ]

[[target]]
name = "Sharp Two"
programme = "Trial"
ra = "09:20:00"
dec = "-31:11:00"
priority = 3
exposures = [ { filter = "V", seconds = 240, count = 6 } ]
maximum_image_size_arcsec = 2.6

[[target]]
name = "Blunt"
programme = "Trial"
ra = "08:50:00"
dec = "-49:12:54"
priority = 1
exposures = [ { filter = "R", seconds = 900, count = 3 } ]
"""

# The two sizes every view is told at.
SIZES = [(80, 24), (160, 50)]

Story = Callable[["Trial"], Awaitable[None]]


def a_logbook(folder: Path, targets: str = TARGETS) -> Path:
    """Return a logbook of the sample's observatory with the targets above."""
    folder.mkdir()
    shutil.copy(sample_logbook() / "observatory.toml", folder)
    (folder / "targets.toml").write_text(targets)
    return folder


def after_dusk_mjd(folder: Path, minutes: float = 20.0) -> float:
    """Return a moment (UTC MJD) so long after nautical dusk on the rehearsal's night."""
    dusk = almanac(load_logbook(folder).observatory.site, NIGHT).nautical_dusk
    assert dusk is not None
    return dusk + minutes / MINUTES_PER_DAY


class Trial:
    """A console under test: its pilot, its clock, and short ways to what a story asks."""

    def __init__(self, console: Console, pilot: Pilot[None], clock: HandClock) -> None:
        self.console = console
        self.pilot = pilot
        self.clock = clock
        self._is_closed = False

    def close(self) -> str | None:
        """Close the night, once; return what the console would say at parting."""
        if self._is_closed:
            return None
        self._is_closed = True
        return self.watch.close()

    @property
    def watch(self) -> Watch:
        """The watch over the night."""
        assert self.console.live is not None
        return self.console.live

    async def press(self, *keys: str) -> None:
        """Press keys and let everything they cause settle."""
        await self.pilot.press(*keys)
        await self.settle()

    async def type(self, text: str) -> None:
        """Type text and press enter."""
        names = {".": "full_stop", " ": "space", "-": "minus"}
        await self.pilot.press(*(names.get(each, each) for each in text), "enter")
        await self.settle()

    async def wait(self, seconds: float) -> None:
        """Let so many seconds of the night pass, and the console see it."""
        self.clock.advance_s(seconds)
        self.console.beat()
        await self.settle()

    async def settle(self) -> None:
        """Wait until no plan is wanted or under way, and no worker is at work."""
        for _ in range(400):
            await self.pilot.pause()
            at_work = any(not each.is_finished for each in self.console.workers)
            if self.console.live is not None and self.console.is_settled and not at_work:
                return
            await asyncio.sleep(0.01)
        raise AssertionError("the console never settled")

    def take_first_run(self) -> None:
        """Take the first target's run to its end, as its keys would."""
        acts.point_at(self.watch, "Sharp One")
        acts.arrive(self.watch)
        acts.start_run(self.watch, acts.lines_now(self.watch))
        for _ in range(30):
            self.clock.advance_s(10.0)
            self.watch.tick()

    def text(self, name: str) -> str:
        """Return what a sheet shows, as text."""
        sheet = self.console.sheet(name)
        return "\n".join(sheet.render_line(row).text for row in range(sheet.size.height))

    def screen(self) -> str:
        """Return everything the screen shows, as text."""
        names = (
            "head",
            "alarm",
            "night",
            "under-way",
            "list",
            "card",
            "panel",
            "notices",
            "entry",
            "foot",
        )
        return "\n".join(self.text(name) for name in names)


def play(
    folder: Path,
    story: Story,
    *,
    size: tuple[int, int] = (160, 50),
    look: str = "night",
    clock: HandClock | None = None,
) -> None:
    """Run a story on a console over a logbook, then close the log as leaving does."""
    hand = clock or HandClock(after_dusk_mjd(folder))

    async def run() -> None:
        console = Console(lambda: open_watch(folder, hand, ("A. Tester",), NIGHT), look=look)
        async with console.run_test(size=size) as pilot:
            trial = Trial(console, pilot, hand)
            await trial.settle()
            try:
                await story(trial)
            finally:
                trial.close()

    asyncio.run(run())
