"""Why a target is left out, and what would have to change: sentences made from the tables."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import date

import numpy as np
from numpy.typing import NDArray

from engine.night import REASONS, Reason
from engine.order.local import day_month, local_date, local_time
from engine.order.order import LeftOut, Visit
from engine.order.problem import Problem
from engine.order.seasons import opens_on
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]

# A plan longer than this is asked to fit with so much of it (min).
PART_MIN = 60.0
# Slews to and from a target are allowed for with the longest there are, and this (min).
SPARE_MIN = 0.2
# So many visits at most are named that a target would take the place of.
NAMED = 3
# More than any night is worth.
WANTED = 1e12


def left_out(problem: Problem, visits: Sequence[Visit]) -> tuple[LeftOut, ...]:
    """Return every target with something left to do that is not visited, and why."""
    visited = {visit.target for visit in visits}
    missing = [
        index
        for index, target in enumerate(problem.targets)
        if target.name not in visited and any(line.remaining for line in problem.plans[target.name])
    ]
    open_ = problem.run_end.max(axis=1, initial=-1) >= 0
    crowded = [n for n in missing if problem.lines_of(n) and open_[problem.lines_of(n)].any()]
    why = _Crowd.of(problem, visits).reasons(crowded)
    return tuple(
        LeftOut(problem.targets[index].name, _told(problem, index, why.get(index)))
        for index in missing
    )


def _told(problem: Problem, index: int, crowded: str | None) -> str:
    why = crowded or _why_closed(problem, index)
    pin_mjd = problem.rules.pinned.get(problem.targets[index].name)
    if pin_mjd is None:
        return why
    return f"pinned to {local_time(problem, pin_mjd)}, when it can't begin: {why}"


def _why_closed(problem: Problem, index: int) -> str:
    """Return why a target can't be exposed at all from now on, and what would open it."""
    target, rules = problem.targets[index], problem.rules
    if target.name in rules.dropped:
        return "dropped for tonight by the observer; release it to have it back"
    missing = [line.filter for line in problem.plans[target.name] if line.remaining]
    own = problem.lines_of(index)
    if not own:
        return f"needs {', '.join(dict.fromkeys(missing))}, put aside for tonight"
    night, at = problem.night, slice(problem.first, None)
    dark: NDArray[np.bool_] = np.asarray(
        night.dark[[problem.lines[line].filter for line in own]][:, at].any(axis=0)
    )
    if not dark.any():
        return "no darkness is left for its filters; tomorrow night again"
    bits = night.limits[index, at]
    free: NDArray[np.bool_] = (bits == 0) & dark
    if free.any():
        last_mjd = float(night.mjd[at][free].max())
        pin_mjd = rules.pinned.get(target.name, -math.inf)
        until_mjd = rules.put_off.get(target.name, pin_mjd)
        if last_mjd < max(until_mjd, pin_mjd):
            ends = f"its limits end at {local_time(problem, last_mjd)}"
            if target.name not in rules.put_off:
                return ends
            return f"put off until {local_time(problem, until_mjd)}, {ends}"
        return _too_soft(problem, index, free)
    # The limit that most of the dark minutes break is the one to name.
    broken = [(int(((bits & reason.bit) != 0)[dark].sum()), reason) for reason in REASONS]
    return _all_night(problem, index, max(broken, key=lambda pair: pair[0])[1], dark)


def _too_soft(problem: Problem, index: int, free: NDArray[np.bool_]) -> str:
    """Return the seeing (zenith, 500 nm) under which images would be within a target's limit.

    Blur of optics and tracking doesn't shrink with the seeing and adds to it in squares.
    """
    telescope, outlook = problem.night.observatory.telescope, problem.outlook
    limit_arcsec = problem.targets[index].maximum_image_size_arcsec
    if limit_arcsec is None:
        return "its limits leave no minute of darkness to it"
    fixed = telescope.optics_fwhm_arcsec**2 + telescope.tracking_fwhm_arcsec**2
    filters = [problem.lines[line].filter for line in problem.lines_of(index)]
    sizes = outlook.image_size_arcsec[filters, index, problem.first :][:, free]
    seeing = outlook.seeing_arcsec[problem.first :][free]
    if limit_arcsec**2 <= fixed:
        return f"its limit of {limit_arcsec:g} arcsec is finer than the telescope's own blur"
    shares = np.sqrt((limit_arcsec**2 - fixed) / np.maximum(sizes**2 - fixed, 1e-6))
    needed_arcsec = float((seeing * shares).max())
    return f"needs seeing under {math.floor(needed_arcsec * 10.0) / 10.0:.1f} arcsec"


def _all_night(problem: Problem, index: int, reason: Reason, dark: NDArray[np.bool_]) -> str:
    """Return which limit a target breaks for the rest of the night, and when it won't."""
    night, target = problem.night, problem.targets[index]
    at = slice(problem.first, None)
    if reason.code == "window":
        coming = [b for b, _ in target.windows_mjd if b > night.mjd[-1]]
        if not coming:
            return "its windows are over; it needs another"
        return f"its next window opens on {local_date(problem, min(coming))}"
    if reason.code == "moon_near":
        widest_deg = float(night.moon_separation_deg[index, at][dark].max())
        asked_deg = target.minimum_moon_separation_deg or 0.0
        return (
            f"at most {widest_deg:.0f} deg from the Moon, {asked_deg:.0f} asked; "
            "wait some days for the Moon to move on"
        )
    told = f"all night {reason.sentence}"
    if reason.code == "airmass" and np.isfinite(night.airmass[index, at][dark]).any():
        told = (
            f"airmass {np.nanmin(night.airmass[index, at][dark]):.2f} at best, "
            f"{target.maximum_airmass:g} asked"
        )
    opens = opens_on(night.observatory, target, night.almanac.night)
    return f"{told}; {_opening(night.almanac.night, opens)}"


def _opening(tonight: date, opens: date | None) -> str:
    if opens is None:
        return "never otherwise from here"
    if (opens - tonight).days <= 1:
        return "earlier in the night it is in reach"
    return f"opens about {day_month(opens)}"


@dataclass(frozen=True, slots=True)
class _Crowd:
    """The visits of an order as columns (V,): minutes from leaving the one before to the end, and
    what each is worth: more than anything for what the observer wants there. ``total`` (V+1,) sums
    that up; ``ways_min`` (N+1,) are the longest ways to each target.
    """

    problem: Problem
    names: tuple[str, ...]
    begin_min: Floats
    end_min: Floats
    worth: Floats
    total: Floats
    ways_min: NDArray[np.float32]

    @classmethod
    def of(cls, problem: Problem, visits: Sequence[Visit]) -> _Crowd:
        rules = problem.rules
        wanted = {*rules.pinned, *([] if rules.first is None else [rules.first])}
        left_mjd = [problem.from_mjd, *(visit.end_mjd for visit in visits[:-1])]
        places = {target.name: place for place, target in enumerate(problem.targets)}
        worth = np.array(
            [WANTED if v.target in wanted else _worth(problem, places[v.target], v) for v in visits]
        )
        begin_mjd, end_mjd = (
            np.array(left_mjd[: len(visits)]),
            np.array([v.end_mjd for v in visits]),
        )
        return cls(
            problem,
            tuple(visit.target for visit in visits),
            (begin_mjd - problem.mjd_at(0.0)) * MINUTES_PER_DAY,
            (end_mjd - problem.mjd_at(0.0)) * MINUTES_PER_DAY,
            worth,
            np.concatenate([[0.0], np.cumsum(worth)]),
            problem.travel.tables.max(axis=(0, 1)),
        )

    def reasons(self, indices: list[int]) -> dict[int, str]:
        """Return why each of some targets that could be exposed is not in the order."""
        return {index: self._reason(index) for index in indices}

    def _reason(self, index: int) -> str:
        problem = self.problem
        least_min = float(problem.contiguous_min[index])
        need_min = min(problem.asked_min(index), max(PART_MIN, least_min))
        lines = problem.lines_of(index)
        # Only what must not be broken can be too long for every stretch of the night.
        longest_min = _longest_min(problem, lines) if least_min > 0.0 else math.inf
        if min(least_min, need_min) > longest_min:
            return (
                f"needs {min(least_min, need_min):.0f} min without a break, "
                f"the longest tonight is {longest_min:.0f} min"
            )
        place = None if index in problem.repeats else self._cheapest(index, lines, need_min)
        if place is None:
            return "its hours go to targets worth more; a higher priority would bring it in"
        first, last = place
        names = list(dict.fromkeys(self.names[first : last + 1]))
        when = local_time(problem, problem.mjd_at(float(self.begin_min[first])))
        instead = (
            " and ".join(names) if len(names) <= 2 else f"{', '.join(names[:-1])}, {names[-1]}"
        )
        return f"would fit at {when} in place of {instead}{self._priority(index, lines, place)}"

    def _cheapest(self, index: int, lines: list[int], need_min: float) -> tuple[int, int] | None:
        """Return the first and last of the visits worth least in whose place a target would fit."""
        problem, visits = self.problem, len(self.names)
        if not visits:
            return None
        way_min = float(self.ways_min[index]) + SPARE_MIN
        begin_min = self.begin_min + way_min
        last = np.searchsorted(self.end_min, begin_min + need_min + way_min)
        minutes = np.minimum(begin_min.astype(np.int64), problem.minutes - 1)
        reach = problem.run_end[np.array(lines)[:, None], minutes].min(axis=0)
        total = self.total
        fits = (last < visits) & (last - np.arange(visits) < NAMED)
        fits &= reach >= begin_min + need_min
        lost = np.where(fits, total[np.minimum(last + 1, visits)] - total[:-1], WANTED)
        first = int(np.argmin(lost))
        return (first, int(last[first])) if lost[first] < WANTED else None

    def _priority(self, index: int, lines: list[int], place: tuple[int, int]) -> str:
        """Return from which priority on a target would be worth more than what is there."""
        problem, own = self.problem, 0.0
        minute = float(self.begin_min[place[0]])
        for line in lines:
            each = problem.lines[line]
            at = min(int(minute + 0.5 * each.whole_min), problem.minutes - 1)
            own += float(problem.worth[line, at]) * each.seconds * each.count
            minute += each.whole_min
        own += float(problem.bonus[index])
        there = float(self.worth[place[0] : place[1] + 1].sum())
        if own <= 0.0:
            return ""
        priority = problem.targets[index].priority
        needed = math.floor(priority * there / own) + 1
        if needed <= priority:
            return ""
        return f", worth more from priority {needed} on" if needed <= 5 else ", though worth less"


def _longest_min(problem: Problem, lines: list[int]) -> float:
    """Return how long at most one of some lines may be exposed without a break (min)."""
    ends = problem.run_end[lines].max(axis=0)
    return float((ends - np.arange(problem.minutes))[ends >= 0].max(initial=0))


def _worth(problem: Problem, index: int, visit: Visit) -> float:
    """Return what the exposures of a visit to a target (its place) are worth."""
    wheel, total = problem.night.observatory, 0.0
    for run in visit.exposures:
        place = wheel.filter_index(run.filter)
        for line in problem.lines_of(index):
            each = problem.lines[line]
            if each.filter == place and each.seconds == run.seconds:
                minute = (run.start_mjd - problem.mjd_at(0.0)) * MINUTES_PER_DAY
                middle = int(minute + 0.5 * run.count * each.each_min)
                rate = problem.worth[line, min(max(middle, 0), problem.minutes - 1)]
                total += float(rate) * run.seconds * run.count
                break
    return total
