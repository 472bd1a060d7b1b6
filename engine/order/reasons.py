"""Why a target is visited now: sentences made from the tables."""

from __future__ import annotations

import numpy as np

from engine.night import reasons_in
from engine.order.local import local_time
from engine.order.order import Visit
from engine.order.problem import Problem
from engine.times import MINUTES_PER_DAY

# An end nearer than this is a reason to go now.
SOON_MIN = 100.0
# An airmass this near its best of the night is as good as the best.
NEAR_BEST = 0.03


def reason_for(problem: Problem, index: int, visit: Visit) -> str:
    """Return why a visit of a target (its place) is now: what ends soon, what is best about it."""
    night = problem.night
    last = night.index_at(visit.end_mjd)
    ahead = night.limits[index, last:] != 0
    parts = _decided(problem, index)
    if ahead.any():
        place = last + int(np.argmax(ahead))
        minutes = (night.mjd[place] - visit.start_mjd) * MINUTES_PER_DAY
        if minutes < SOON_MIN:
            parts.append(f"{_ending(problem, index, place)} in {minutes:.0f} min")
    moonrise_mjd = _moonrise_mjd(problem, visit)
    if moonrise_mjd is not None:
        parts.append(_before_the_moon(problem, index, visit, moonrise_mjd))
    elif not parts:
        parts.append(_height(problem, index, visit))
    target = problem.targets[index]
    if target.role == "standard":
        parts.append("standard")
    elif target.priority == 5:
        parts.append("first priority")
    return ", ".join(parts)


def _decided(problem: Problem, index: int) -> list[str]:
    """Return what the observer decided that puts a target where it is."""
    rules, name = problem.rules, problem.targets[index].name
    if name in rules.pinned:
        return [f"pinned to {local_time(problem, rules.pinned[name])}"]
    return ["held"] if rules.hold and rules.first == name else []


def _ending(problem: Problem, index: int, place: int) -> str:
    """Return what ends a target's time at a place in the grid."""
    first = reasons_in(int(problem.night.limits[index, place]))[0]
    return {
        "below_horizon": "sets",
        "skyline": "goes behind the skyline",
        "too_low": "too low",
        "too_high": "too near the zenith",
        "hour_angle": "out of the mount's hour angles",
        "window": "its window closes",
        "airmass": "beyond its airmass",
        "moon_near": "too near the Moon",
        "daylight": "dawn",
        "sun_near": "the Sun",
    }.get(first.code, first.label)


def _moonrise_mjd(problem: Problem, visit: Visit) -> float | None:
    """Return when the Moon rises, if within two hours of a visit that still has a dark sky."""
    night = problem.night
    begin, end = night.index_at(visit.start_mjd), night.index_at(visit.end_mjd + 2.0 / 24.0)
    up = night.moon.altitude_deg[begin:end] > 0.0
    if up.size == 0 or up[0] or not up.any():
        return None
    return float(night.mjd[begin + int(np.argmax(up))])


def _before_the_moon(problem: Problem, index: int, visit: Visit, moonrise_mjd: float) -> str:
    rises = f"the Moon rises at {local_time(problem, moonrise_mjd)}"
    best, best_mjd = _best_airmass(problem, index)
    if best_mjd > moonrise_mjd and visit.airmass_start > best + NEAR_BEST:
        return f"best airmass {best:.2f} at {local_time(problem, best_mjd)}, but {rises}"
    return f"before {rises}"


def _best_airmass(problem: Problem, index: int) -> tuple[float, float]:
    """Return the least airmass ahead at which a target may be observed, and when (UTC MJD)."""
    night = problem.night
    allowed = night.limits[index, problem.first :] == 0
    usable = np.where(allowed, night.airmass[index, problem.first :], np.inf)
    place = int(np.argmin(usable))
    return float(usable[place]), float(night.mjd[problem.first + place])


def _height(problem: Problem, index: int, visit: Visit) -> str:
    best, best_mjd = _best_airmass(problem, index)
    if visit.airmass_start <= best + NEAR_BEST:
        return f"near its best airmass, {best:.2f}"
    return f"airmass {visit.airmass_start:.2f}, best {best:.2f} at {local_time(problem, best_mjd)}"
