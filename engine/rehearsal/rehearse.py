"""A rehearsal: a copy of the sample logbook, an invented night over it, and a clock for it."""

from __future__ import annotations

import shutil
from dataclasses import dataclass
from datetime import date
from pathlib import Path

from engine.clock import Clock, HandClock
from engine.errors import WarmroomError
from engine.log import read_log
from engine.logbook import load_logbook, sample_logbook
from engine.positions import almanac
from engine.rehearsal.player import Player
from engine.rehearsal.weather import invent_night
from engine.times import MINUTES_PER_DAY
from engine.watch import Watch, open_watch

# The Moon is four days past full on this night and rises at dusk: the order has to mind it.
NIGHT = date(2027, 3, 25)
OBSERVER = "rehearsal"
BEFORE_DUSK_MIN = 12.0
STEP_S = 10.0


@dataclass(frozen=True, slots=True)
class Rehearsal:
    """Everything a rehearsed night needs: where, which night, from when to when (UTC MJD)."""

    folder: Path
    night: date
    begin_mjd: float
    end_mjd: float
    player: Player


def prepare(folder: Path, night: date, seed: int) -> Rehearsal:
    """Return a rehearsal in a folder, copying the sample logbook there unless it is there.

    WarmroomError when the folder holds another logbook, or any file that the sample would replace:
    a rehearsal never writes into a real one.
    """
    sample = sample_logbook()
    head = folder / "observatory.toml"
    if head.exists():
        if head.read_bytes() != (sample / "observatory.toml").read_bytes():
            raise WarmroomError(f"{folder}: holds a logbook of its own, expected a copy or none")
    else:
        _copy(sample, folder)
    logbook = load_logbook(folder)
    site = logbook.observatory.site
    times = almanac(site, night)
    begin, end = times.nautical_dusk, times.nautical_dawn
    if begin is None or end is None:
        raise WarmroomError(f"{site.name} has no dark night on {night.isoformat()}")
    begin_mjd = begin - BEFORE_DUSK_MIN / MINUTES_PER_DAY
    end_mjd = end + BEFORE_DUSK_MIN / MINUTES_PER_DAY
    truth = invent_night(begin_mjd, end_mjd, logbook.observatory.seeing.typical_arcsec, seed)
    return Rehearsal(folder, night, begin_mjd, end_mjd, Player(truth, seed))


def _copy(sample: Path, folder: Path) -> None:
    """Copy the sample logbook, in place of nothing."""
    taken = next((path for each in sample.iterdir() if (path := folder / each.name).exists()), None)
    if taken is not None:
        raise WarmroomError(f"{taken}: is there already, expected a folder without it")
    try:
        shutil.copytree(sample, folder, dirs_exist_ok=True)
    except OSError as error:
        raise WarmroomError(f"{folder}: {error.strerror}, expected a folder to write to") from None


def resume_mjd(rehearsal: Rehearsal) -> float:
    """Return when a rehearsed night goes on (UTC MJD): its begin, or the last entry of its log."""
    path = rehearsal.folder / f"{rehearsal.night.isoformat()}.toml"
    if not path.exists():
        return rehearsal.begin_mjd
    return max([rehearsal.begin_mjd, *(event.t_mjd for event in read_log(path).events)])


def open_rehearsal(rehearsal: Rehearsal, clock: Clock) -> Watch:
    """Return the watch over a rehearsed night."""
    return open_watch(rehearsal.folder, clock, (OBSERVER,), rehearsal.night).watch


def play_unwatched(rehearsal: Rehearsal) -> Watch:
    """Play the whole night at once and close its log; return the watch as it ended."""
    clock = HandClock(rehearsal.begin_mjd)
    watch = open_rehearsal(rehearsal, clock)
    while clock.now_mjd() < rehearsal.end_mjd:
        watch.tick()
        work = watch.planning()
        if work is not None:
            watch.adopt(work())
        rehearsal.player.tick(watch)
        clock.advance_s(STEP_S)
    if watch.state.run is not None:
        from engine.watch import acts

        acts.stop(watch)
    watch.close()
    return watch
