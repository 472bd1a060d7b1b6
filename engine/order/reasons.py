"""Why a target is visited now, and why another is left out: sentences made from the tables."""

from __future__ import annotations

from zoneinfo import ZoneInfo

import numpy as np

from engine.night import REASONS, reasons_in
from engine.order.order import LeftOut, Visit
from engine.order.problem import Problem
from engine.times import MINUTES_PER_DAY, datetime_from_mjd

# An end nearer than this is a reason to go now.
SOON_MIN = 100.0
# An airmass this near its best of the night is as good as the best.
NEAR_BEST = 0.03


def local_time(problem: Problem, mjd: float) -> str:
    """Return a moment (UTC MJD) as local time, ``02:10``."""
    zone = ZoneInfo(problem.night.observatory.site.timezone)
    return datetime_from_mjd(mjd + 0.5 / MINUTES_PER_DAY).astimezone(zone).strftime("%H:%M")


def reason_for(problem: Problem, visit: Visit) -> str:
    """Return why a visit is now: what ends soon, or what is best about it."""
    night = problem.night
    index = night.target_index(visit.target)
    last = night.index_at(visit.end_mjd)
    ahead = night.limits[index, last:] != 0
    parts = _decided(problem, index)
    if ahead.any():
        place = last + int(np.argmax(ahead))
        minutes = (night.mjd[place] - visit.start_mjd) * MINUTES_PER_DAY
        if minutes < SOON_MIN:
            parts.append(f"{_ending(problem, index, place)} in {minutes:.0f} min")
    parts += _moon_coming(problem, visit)
    if not parts:
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


def _moon_coming(problem: Problem, visit: Visit) -> list[str]:
    """Return that the Moon rises within two hours of a visit that still has a dark sky."""
    night = problem.night
    begin, end = night.index_at(visit.start_mjd), night.index_at(visit.end_mjd + 2.0 / 24.0)
    up = night.moon.altitude_deg[begin:end] > 0.0
    if up.size == 0 or up[0] or not up.any():
        return []
    return [
        f"before the Moon rises at {local_time(problem, night.mjd[begin + int(np.argmax(up))])}"
    ]


def _height(problem: Problem, index: int, visit: Visit) -> str:
    night = problem.night
    masses = night.airmass[index, problem.first :]
    allowed = night.limits[index, problem.first :] == 0
    usable = np.where(allowed, masses, np.inf)
    best = int(np.argmin(usable))
    if visit.airmass_start <= usable[best] + NEAR_BEST:
        return f"near its best airmass, {usable[best]:.2f}"
    when = local_time(problem, night.mjd[problem.first + best])
    return f"airmass {visit.airmass_start:.2f}, best {usable[best]:.2f} at {when}"


def left_out(problem: Problem, visited: set[str]) -> tuple[LeftOut, ...]:
    """Return every target with something left to do that is not visited, and why."""
    return tuple(
        LeftOut(target.name, _why_left_out(problem, index))
        for index, target in enumerate(problem.targets)
        if target.name not in visited and any(line.remaining for line in problem.plans[target.name])
    )


def _why_left_out(problem: Problem, index: int) -> str:
    name = problem.targets[index].name
    pin_mjd = problem.rules.pinned.get(name)
    if pin_mjd is not None:
        return f"pinned to {local_time(problem, pin_mjd)}, but {_why_not_in(problem, index)}"
    return _why_not_in(problem, index)


def _why_not_in(problem: Problem, index: int) -> str:
    name = problem.targets[index].name
    if name in problem.rules.dropped:
        return "dropped for tonight by the observer"
    own = [place for place in problem.of_target[index] if place >= 0]
    if not own:
        return "each filter it still needs was put aside for tonight"
    if (problem.run_end[own] >= 0).any():
        return "its hours go to targets worth more; a higher priority would bring it in"
    night, at = problem.night, slice(problem.first, None)
    dark = night.dark[[problem.lines[place].filter for place in own]][:, at].any(axis=0)
    if not dark.any():
        return "no darkness is left for its filters"
    bits = night.limits[index, at]
    if ((bits == 0) & dark).any():
        return "its images would be larger than its own limit; better seeing would bring it in"
    # The limit that most of the dark minutes break is the one to name.
    broken = [(int(((bits & reason.bit) != 0)[dark].sum()), reason) for reason in REASONS]
    _, reason = max(broken, key=lambda pair: pair[0])
    return f"all night {reason.sentence}"
