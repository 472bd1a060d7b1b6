"""A small night to watch over: one logbook, a clock set by hand, a console that may be cut off."""

from __future__ import annotations

import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from engine.clock import HandClock
from engine.logbook import load_logbook, sample_logbook
from engine.positions import almanac
from engine.rehearsal import NIGHT
from engine.times import MINUTES_PER_DAY
from engine.watch import Watch, open_watch

# Two that are high in the evening of the rehearsal's night.
TARGETS = """
[[target]]
name = "Near"
ra = "06:29:34"
dec = "-31:17:00"
exposures = [ { filter = "B", seconds = 30, count = 2 }, { filter = "V", seconds = 20, count = 2 } ]

[[target]]
name = "Far"
ra = "09:20:00"
dec = "-31:11:00"
exposures = [ { filter = "V", seconds = 240, count = 6 } ]
"""


def small_logbook(folder: Path) -> Path:
    """Return a folder with the sample's observatory and the targets above."""
    shutil.copy(sample_logbook() / "observatory.toml", folder)
    (folder / "targets.toml").write_text(TARGETS)
    return folder


def evening_clock(folder: Path) -> HandClock:
    """Return a clock twenty minutes after nautical dusk."""
    dusk = almanac(load_logbook(folder).observatory.site, NIGHT).nautical_dusk
    assert dusk is not None
    return HandClock(dusk + 20.0 / MINUTES_PER_DAY)


@contextmanager
def a_console(folder: Path, clock: HandClock) -> Iterator[Watch]:
    """Have the night open; at the end it is left as a power cut leaves it, without a word."""
    watch = open_watch(folder, clock, ("A. Tester",), NIGHT).watch
    plan(watch)
    try:
        yield watch
    finally:
        watch._pen.close()


def plan(watch: Watch) -> None:
    """Make the plan that is wanted."""
    work = watch.planning()
    if work is not None:
        watch.adopt(work())
