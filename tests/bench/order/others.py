"""Ours beside astroplan's PriorityScheduler, a general library's way to order a list.

It is given the same night: each line of a plan as a block with its readouts, the same priorities,
transitions with the mount's rate, settling in every block, and the same limits minute by minute, as
a constraint that reads our tables. Its schedule is then scored by our merit, exposure by exposure,
each at its own middle; an exposure that breaks a limit counts nothing, the others count. A plan
that is finished earns its bonus. It knows nothing of series that must not be broken or of turning
over at the meridian, so neither is asked of it.
"""

from __future__ import annotations

from functools import partial
from typing import Any

import astropy.units as u
import numpy as np
from astroplan import Constraint, FixedTarget, Observer
from astroplan.scheduling import ObservingBlock, PriorityScheduler, Schedule, Transitioner
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.time import Time

from engine.order import Problem, upper_limit
from engine.order.merit import exposure_worth
from engine.positions import prepare_astropy
from engine.times import MINUTES_PER_DAY
from tests.bench.order.column import Column
from tests.bench.order.nights import load_of, random_night
from tests.bench.order.quality import HEAD, OURS, PLAIN, print_size

# It fails on some lists with an error of its own ('block already occupied'): then coarser steps are
# tried, and if all fail the best of what it had placed until then counts.
RESOLUTIONS_MIN = (2.0, 3.0, 5.0)
THEIRS = "PriorityScheduler"


class _Allowed(Constraint):  # type: ignore[misc]
    """Our own limits and worth for one line, read at the times that are asked."""

    def __init__(self, problem: Problem, line: int) -> None:
        worth = problem.worth[line].astype(float)
        self.scores = worth / max(float(worth.max()), 1e-9)
        self.begin_mjd = problem.mjd_at(0.0)

    def compute_constraint(self, times: Time, observer: Observer, targets: Any) -> Any:
        """Return the worth relative to the best minute's; 0 is forbidden."""
        minutes = (times.mjd - self.begin_mjd) * MINUTES_PER_DAY
        at = np.clip(minutes.astype(int), 0, len(self.scores) - 1)
        within = (minutes >= 0.0) & (minutes < len(self.scores))
        return np.where(within, self.scores[at], 0.0)


def library_value(problem: Problem, failed: list[float]) -> float:
    """Return what PriorityScheduler's schedule is worth by our merit.

    When it fails at every resolution, what it had placed is worth goes to ``failed`` too.
    """
    unfinished = []
    for resolution_min in RESOLUTIONS_MIN:
        begin_mjd, end_mjd = (problem.mjd_at(at) for at in (problem.start_min, problem.minutes))
        schedule = Schedule(Time(begin_mjd, format="mjd"), Time(end_mjd, format="mjd"))
        try:
            _schedule(problem, schedule, resolution_min)
        except ValueError:
            unfinished.append(_scored(problem, schedule))
        else:
            return _scored(problem, schedule)
    failed.append(max(unfinished))
    return failed[-1]


def _schedule(problem: Problem, schedule: Schedule, resolution_min: float) -> None:
    """Let astroplan fill a schedule."""
    telescope, site = problem.night.observatory.telescope, problem.night.observatory.site
    observer = Observer(
        location=EarthLocation.from_geodetic(
            site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
        )
    )
    scheduler = PriorityScheduler(
        observer=observer,
        transitioner=Transitioner(telescope.slew_deg_per_s * u.deg / u.s),
        constraints=[],
        time_resolution=resolution_min * u.min,
    )
    places = range(len(problem.lines))
    scheduler([_block(problem, place, resolution_min) for place in places], schedule)


def _block(problem: Problem, place: int, resolution_min: float) -> ObservingBlock:
    line, settle_min = problem.lines[place], problem.night.observatory.telescope.settle_s / 60.0
    target = problem.targets[line.target]
    # Whole steps of its grid, for it cuts what is left over.
    steps = np.ceil((line.whole_min + settle_min) / resolution_min)
    return ObservingBlock(
        FixedTarget(SkyCoord(target.ra_deg * u.deg, target.dec_deg * u.deg), name=target.name),
        steps * resolution_min * u.min,
        # With it the least number comes first.
        6 - target.priority,
        constraints=[_Allowed(problem, place)],
        name=str(place),
    )


def _scored(problem: Problem, schedule: Schedule) -> float:
    """Return the worth of the lawful exposures, and the bonus of the plans they finish."""
    settle_min = problem.night.observatory.telescope.settle_s / 60.0
    left = np.array([line.count for line in problem.lines])
    total = 0.0
    for block in schedule.observing_blocks:
        place = int(block.name)
        line = problem.lines[place]
        begin_min = (block.start_time.mjd - problem.mjd_at(0.0)) * MINUTES_PER_DAY
        begins = begin_min + settle_min + line.change_min + np.arange(line.count) * line.each_min
        exposed_min = line.seconds / 60.0
        last = problem.minutes - 1
        at = np.minimum(begins.astype(int), last)
        lawful = problem.run_end[place, at] >= begins + exposed_min
        middles = np.minimum((begins + 0.5 * exposed_min).astype(int), last)
        quality = problem.worth[place, middles[lawful]].astype(float)
        total += exposure_worth(1, line.seconds, float(quality.sum()))
        left[place] -= int(lawful.sum())
    for target, bonus in enumerate(problem.bonus):
        if bonus > 0.0 and not left[problem.lines_of(target)].any():
            total += float(bonus)
    return total


def table(sizes: list[int], nights: int, first_seed: int) -> None:
    """Print a line for each size and method, astroplan's among them."""
    prepare_astropy()
    print(f"percent of the proven limit, {nights} nights a size; astroplan in steps of")
    print(f"{RESOLUTIONS_MIN[0]:.0f} min, scored exposure by exposure, the lawful ones\n\n{HEAD}")
    for size in sizes:
        failed: list[float] = []
        columns = {name: Column() for name in [*PLAIN, THEIRS, *OURS]}
        for number in range(nights):
            problem = random_night(first_seed + number, size, load_of(number)).problem()
            limit = upper_limit(problem)
            if limit <= 0.0:
                continue
            columns[THEIRS].timed(partial(library_value, problem, failed), limit)
            for name, method in (PLAIN | OURS).items():
                columns[name].timed(partial(method, problem), limit)
        print_size(size, columns)
        print(
            f"{'':7}  {THEIRS}: ended in an error of its own on {len(failed)} nights\n", flush=True
        )
