"""The search for an order: value with urgency, several tempers of it, and the best of them kept.

At each step every target is tried at once: how many exposures of each filter could be placed from
now, what they are worth, how long they take with the way there. The best rate wins, made more
urgent for a target that will soon be out of reach. This is done for several weights of urgency, and
once along the order in force; the most valuable result is returned, the one in force being given
a small bonus because an observer can't follow a list that reshuffles.
"""

from __future__ import annotations

import time
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine.order.merit import exposure_worth, finished_worth
from engine.order.order import Order, PlacedExposures, Visit
from engine.order.problem import Problem
from engine.order.reasons import left_out, reason_for
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]

# (weight of urgency, minutes over which it is felt): the first is plain best value first.
TEMPERS = ((0.0, 60.0), (0.7, 40.0), (1.5, 60.0), (3.0, 60.0), (1.5, 150.0), (4.0, 150.0))
# What keeping the order in force is worth: ORDER's steadiness, common practice, no source.
KEEPING_BONUS = 0.05
# Time lost to what nobody plans for between two visits, as a share of the way there.
LEAST_VISIT_MIN = 0.5


@dataclass(frozen=True, slots=True)
class _Stay:
    """Visits under construction: target, begin and end in minutes, exposures per line."""

    target: int
    begin: float
    end: float
    placed: tuple[tuple[int, int, float], ...]  # line, count, begin of the first exposure


def propose(problem: Problem, in_force: Order | None = None) -> Order:
    """Return an order for the rest of the night; the best found, never an unlawful one."""
    began = time.perf_counter()
    candidates = [_build(problem, temper) for temper in TEMPERS]
    values = [_value(problem, stays) for stays in candidates]
    best = int(np.argmax(values))
    stays, value = candidates[best], values[best]
    if in_force is not None:
        kept = _build(problem, TEMPERS[2], along=_turn_ahead(problem, in_force))
        kept_value = _value(problem, kept)
        if kept_value * (1.0 + KEEPING_BONUS) >= value:
            stays, value = kept, kept_value
    visits = [_visit(problem, stay) for stay in stays]
    visits = [replace(v, reason=reason_for(problem, v)) for v in visits]
    return Order(
        from_mjd=problem.from_mjd,
        until_mjd=problem.mjd_at(problem.minutes - 1),
        value=value,
        visits=tuple(visits),
        left_out=left_out(problem, {visit.target for visit in visits}),
        compute_ms=(time.perf_counter() - began) * 1e3,
    )


def _turn_ahead(problem: Problem, order: Order) -> list[tuple[int, float]]:
    """Return the targets of an order from now on, in its turn, each with its minute."""
    known = {target.name: index for index, target in enumerate(problem.targets)}
    first_mjd = problem.mjd_at(0.0)
    return [
        (known[visit.target], (visit.start_mjd - first_mjd) * MINUTES_PER_DAY)
        for visit in order.visits
        if visit.end_mjd > problem.from_mjd and visit.target in known
    ]


def _build(
    problem: Problem, temper: tuple[float, float], along: Sequence[tuple[int, float]] = ()
) -> list[_Stay]:
    """Return stays from now to the end of the night: along a given turn first, then by rate."""
    remaining = problem.remaining.copy()
    ahead = list(along)
    if problem.rules.first is not None:
        ahead.insert(0, (problem.night.target_index(problem.rules.first), 0.0))
    stays: list[_Stay] = []
    minute, here = 0.0, problem.pointing
    while minute < problem.minutes - 1:
        tries = _Tries.at(problem, remaining, minute, here)
        if ahead:
            chosen, wanted_at = ahead[0]
            if tries.worth[chosen] <= 0.0 and minute < wanted_at:
                # Not yet: what was planned for a moment waits for it.
                minute = min(minute + 1.0, wanted_at)
                continue
            ahead.pop(0)
            if tries.worth[chosen] <= 0.0:
                continue
        else:
            best = _best(problem, tries, temper, minute)
            if best is None:
                minute = _next_chance(problem, remaining, minute)
                continue
            chosen = best
        stay = tries.stay(problem, chosen)
        for line, count, _ in stay.placed:
            remaining[line] -= count
        stays.append(stay)
        minute, here = stay.end, chosen
    return stays


def _best(
    problem: Problem, tries: _Tries, temper: tuple[float, float], minute: float
) -> int | None:
    weight, felt_min = temper
    at = min(int(minute), problem.minutes - 1)
    slack = np.maximum(problem.left[:, at] - tries.needed, 0.0)
    rate = tries.worth / np.maximum(tries.end - minute, LEAST_VISIT_MIN)
    score = rate * (1.0 + weight * np.exp(-slack / felt_min))
    chosen = int(np.argmax(score))
    return chosen if score[chosen] > 0.0 else None


def _next_chance(problem: Problem, remaining: NDArray[np.int64], minute: float) -> float:
    """Return the next minute at which anything can be exposed; the end when nothing can."""
    at = int(minute) + 1
    waiting = problem.stay[remaining > 0, at:]
    chances = np.flatnonzero((waiting > 0.0).any(axis=0)) if waiting.size else np.array([])
    return float(at + chances[0]) if chances.size else float(problem.minutes)


@dataclass(frozen=True, slots=True)
class _Tries:
    """Every target tried from one minute: what could be placed (N, K), its worth, when it ends."""

    begin: float
    counts: NDArray[np.int64]
    starts: Floats
    worth: Floats
    end: Floats
    needed: Floats

    @classmethod
    def at(
        cls, problem: Problem, remaining: NDArray[np.int64], minute: float, here: int | None
    ) -> _Tries:
        """Return what could be placed on each target, going there at a minute."""
        table, each_min = problem.of_target, problem.each_min
        arrived = minute + problem.move_min(here, int(minute))
        clock = arrived.copy()
        worth, needed = np.zeros(len(table)), np.zeros(len(table))
        counts, starts = np.zeros(table.shape, dtype=np.int64), np.zeros(table.shape)
        for column in range(table.shape[1]):
            line = table[:, column]
            start = clock + problem.change_min[line]
            at = np.minimum(np.ceil(start).astype(np.int64), problem.minutes - 1)
            # The limits hold at the end of an exposure too, hence the last minute is left free.
            room = np.maximum(problem.stay[line, at] - 1.0, 0.0)
            count = np.minimum((room / each_min[line]).astype(np.int64), remaining[line])
            length = count * each_min[line]
            middle = np.minimum((start + length / 2.0).astype(np.int64), problem.minutes - 1)
            worth += problem.worth[line, middle] * problem.seconds[line] * count
            needed += remaining[line] * each_min[line]
            counts[:, column], starts[:, column] = count, start
            clock = np.where(count > 0, start + length, clock)
        # What wants to be uninterrupted for so long takes that long or all that remains of it.
        whole = clock - arrived + 1e-9 >= np.minimum(problem.contiguous_min, needed)
        return cls(minute, counts, starts, np.where(whole, worth, 0.0), clock, needed)

    def stay(self, problem: Problem, target: int) -> _Stay:
        """Return the stay on one target."""
        placed = tuple(
            (int(line), int(count), float(start))
            for line, count, start in zip(
                problem.of_target[target], self.counts[target], self.starts[target], strict=True
            )
            if count > 0
        )
        return _Stay(target, self.begin, float(self.end[target]), placed)


def _value(problem: Problem, stays: list[_Stay]) -> float:
    """Return what stays are worth by the documented merit, exposure by exposure."""
    total = 0.0
    taken = [0] * len(problem.lines)
    for stay in stays:
        for place, count, start in stay.placed:
            line = problem.lines[place]
            taken[place] += count
            middles = start + np.arange(count) * problem.each_min[place] + line.seconds / 120.0
            at = np.minimum(middles.astype(np.int64), problem.minutes - 1)
            priority = problem.targets[line.target].priority
            total += sum(
                exposure_worth(priority, line.seconds, float(worth) / priority)
                for worth in problem.worth[place, at]
            )
    return total + sum(
        finished_worth(target.priority, sum(e.seconds * e.count for e in target.exposures))
        for index, target in enumerate(problem.targets)
        if _finishes(problem, index, taken)
    )


def _finishes(problem: Problem, index: int, taken: list[int]) -> bool:
    own = [place for place in problem.of_target[index] if place >= 0]
    asked = sum(1 for line in problem.plans[problem.targets[index].name] if line.remaining)
    return (
        bool(own)
        and len(own) == asked
        and all(taken[place] >= problem.lines[place].count for place in own)
    )


def _visit(problem: Problem, stay: _Stay) -> Visit:
    night, target = problem.night, problem.targets[stay.target]
    start_mjd = problem.mjd_at(stay.begin)
    end_mjd = problem.mjd_at(stay.end)
    first = night.index_at(problem.mjd_at(stay.placed[0][2]))
    last = night.index_at(end_mjd)
    sizes = [
        problem.outlook.image_size_arcsec[
            problem.lines[place].filter, stay.target, night.index_at(problem.mjd_at(start))
        ]
        for place, _, start in stay.placed
    ]
    return Visit(
        target=target.name,
        start_mjd=start_mjd,
        end_mjd=end_mjd,
        exposures=tuple(
            PlacedExposures(
                filter=night.observatory.filters[problem.lines[place].filter].name,
                seconds=problem.lines[place].seconds,
                count=count,
                start_mjd=start_mjd + (start - stay.begin) / MINUTES_PER_DAY,
            )
            for place, count, start in stay.placed
        ),
        airmass_start=float(night.airmass[stay.target, first]),
        airmass_end=float(night.airmass[stay.target, last]),
        image_size_arcsec=float(max(sizes)),
    )
