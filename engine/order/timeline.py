"""The exact order: blocks timed to the second, in turn.

Minutes are those of the problem's first column. What is left free is filled by
`engine.order.filling`. Limits hold at the grid's minutes before and after every exposure, and at
all between.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from engine.order.blocks import TICKS_PER_MIN, Blocks
from engine.order.merit import exposure_worth
from engine.order.order import Order, PlacedExposures
from engine.order.pins import pin_worths
from engine.order.problem import Problem
from engine.order.repeats import SAMPLED_SHARE, Repeats
from engine.order.sequence import Timed
from engine.order.stays import Run, Stay, without_break
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]

# A block that the search put off by more than this is put off; less is its rounding.
PUT_OFF_MIN = 1.0
# How much later than it arrives a run may begin when a limit still forbids it.
WAIT_MIN = 2
# A pinned target that would be late by less than this is made room for.
SECONDS_LATE_MIN = 5.0


class Timeline:
    """Stays in turn, and what is left of every line."""

    def __init__(self, problem: Problem) -> None:
        self.problem = problem
        self.stays: list[Stay] = []
        self.left = np.array([line.count for line in problem.lines], dtype=np.int64)

    def place(self, blocks: Blocks, timed: Timed) -> None:
        """Time blocks exactly, in turn: what no longer fits is left to the filling."""
        start_tick = self.problem.start_min * TICKS_PER_MIN
        for block, tick in zip(timed.blocks, timed.ticks, strict=True):
            target, parts = int(blocks.target[block]), blocks.parts[block]
            if target in self.problem.pins:
                self._keep_appointment(target, parts)
            wanted_min = (max(float(tick), start_tick)) / TICKS_PER_MIN
            self._append(target, parts, wanted_min)

    def _keep_appointment(self, target: int, parts: Sequence[tuple[int, int]]) -> None:
        """Give up what comes before a pinned target and would make it late.

        Blocks are timed to half a minute before; this is for the last seconds.
        """
        problem = self.problem
        leave_min = problem.pins[target] - problem.lines[parts[0][0]].change_min
        # An appointment that has passed binds nobody any more.
        while self.stays and leave_min >= problem.start_min:
            last = self.stays[-1]
            way_min = problem.travel.exact_min(last.target, last.end_min, target, leave_min)
            late_min = last.end_min + way_min - leave_min
            if last.target == target or not 0.0 < late_min < SECONDS_LATE_MIN:
                return
            run = last.runs.pop()
            self.left[run.line] += 1
            last.end_min -= problem.lines[run.line].each_min
            if run.count > 1:
                last.runs.append(replace(run, count=run.count - 1))
            broken = last.target in problem.repeats or not last.runs
            if broken or not self._is_still_long_enough(last):
                self._give_back(self.stays.pop())

    def repeat(self, order: Order) -> float:
        """Take over the visits of an order still ahead, at their times; return the share lost.

        The share is of the minutes of exposures, counted as what is still wanted of them.
        """
        problem = self.problem
        known = {target.name: index for index, target in enumerate(problem.targets)}
        ahead_min = 0.0
        for visit in order.visits:
            if visit.target not in known or visit.end_mjd <= problem.from_mjd:
                continue
            parts: list[tuple[int, int]] = []
            begins_min: list[float] = []
            for run in visit.exposures:
                begin_min = (run.start_mjd - problem.mjd_at(0.0)) * MINUTES_PER_DAY
                found = self._parts_ahead(known[visit.target], run, begin_min)
                if found is not None:
                    parts.append(found)
                    begins_min.append(begin_min)
                    ahead_min += found[1] * problem.lines[found[0]].each_min
            if parts:
                change_min = problem.lines[parts[0][0]].change_min
                self._append(known[visit.target], parts, begins_min[0] - change_min, 0.0)
        taken_min = sum(stay.end_min - stay.runs[0].begin_min for stay in self.stays)
        return max(1.0 - taken_min / ahead_min, 0.0) if ahead_min > 0.0 else 1.0

    def _parts_ahead(
        self, target: int, run: PlacedExposures, begin_min: float
    ) -> tuple[int, int] | None:
        """Return the line of a run and how many of its exposures are ahead and still wanted."""
        problem = self.problem
        for line in problem.lines_of(target):
            each = problem.lines[line]
            name = problem.night.observatory.filters[each.filter].name
            if name == run.filter and each.seconds == run.seconds:
                gone = math.ceil((problem.start_min - begin_min) / each.each_min - 1e-6)
                count = min(run.count - max(gone, 0), int(self.left[line]))
                return (line, count) if count > 0 else None
        return None

    def _may_begin(self, stay: Stay, parts: Sequence[tuple[int, int]]) -> bool:
        """Say whether a stay is a whole visit of its series and stands off from the one before."""
        repeats = self.problem.repeats.get(stay.target)
        if repeats is None or self._goes_on(repeats, parts):
            return True
        whole = [(run.line, run.count) for run in stay.runs] == list(parts)
        last_min = self._last_begin_min(stay.target)
        return whole and repeats.may_begin(stay.runs[0].begin_min, last_min)

    def _goes_on(self, repeats: Repeats, parts: Sequence[tuple[int, int]]) -> bool:
        """Say whether parts are what is left of a visit that was begun before now."""
        whole = max(sum(count for _, count in visit) for visit in repeats.visits)
        return repeats.begun and sum(count for _, count in parts) < whole

    def _last_begin_min(self, target: int) -> float:
        repeats = self.problem.repeats[target]
        begins = [
            stay.runs[0].begin_min
            for stay in self.stays
            if stay.target == target
            and not self._goes_on(repeats, [(run.line, run.count) for run in stay.runs])
        ]
        return max([repeats.last_min, *begins])

    def _append(
        self,
        target: int,
        parts: Sequence[tuple[int, int]],
        wanted_min: float,
        put_off_min: float = PUT_OFF_MIN,
    ) -> None:
        problem = self.problem
        last = self.stays[-1] if self.stays else None
        leave_min = last.end_min if last else problem.start_min
        here = last.target if last else problem.pointing
        arrive_min = leave_min + problem.travel.exact_min(here, leave_min, target, leave_min)
        if wanted_min > arrive_min + put_off_min:
            arrive_min = wanted_min
        repeats = problem.repeats.get(target)
        if repeats is not None and not self._goes_on(repeats, parts):
            first_min = self._last_begin_min(target) + repeats.least_min
            arrive_min = max(arrive_min, first_min - problem.lines[parts[0][0]].change_min)
        stay = Stay(target, leave_min, arrive_min)
        for line, count in parts:
            run = self.run(here, leave_min, line, count, stay.end_min)
            if run is not None:
                stay.runs.append(run)
                stay.end_min = run.begin_min + run.count * problem.lines[line].each_min
                here, leave_min = target, stay.end_min
        if stay.runs and self._long_enough(stay) and self._may_begin(stay, parts):
            self.put(len(self.stays), stay)

    def run(
        self, here: int, leave_min: float, line: int, count: int, ready_min: float
    ) -> Run | None:
        """Return a run as soon as a mount that leaves a target can begin it; None if none fits."""
        problem, each = self.problem, self.problem.lines[line]
        # What is pinned begins at its moment, to the second.
        pin_min = problem.pins.get(each.target, 0.0)
        begin_min = max(ready_min + each.change_min, pin_min)
        for _ in range(WAIT_MIN + 1):
            # A german mount may have to turn over when the begin slips across the meridian.
            way_min = problem.travel.exact_min(here, leave_min, each.target, begin_min)
            begin_min = max(begin_min, leave_min + way_min + each.change_min)
            fit = min(count, self.room(line, begin_min))
            if fit > 0:
                return Run(line, fit, begin_min)
            begin_min = float(int(begin_min) + 1)
        return None

    def room(self, line: int, begin_min: float) -> int:
        """Return how many exposures of a line fit before a limit when begun at a minute."""
        if begin_min >= self.problem.minutes:
            return 0
        each = self.problem.lines[line]
        end_min = self.problem.run_end[line, int(begin_min)]
        return max(int((end_min - begin_min + self.problem.readout_min) / each.each_min), 0)

    def _long_enough(self, stay: Stay) -> bool:
        """Say whether a stay is as long without a break as its target asks, if it can be."""
        least = min(
            self.problem.contiguous_min[stay.target],
            sum(
                self.left[line] * self.problem.lines[line].each_min
                for line in self.problem.lines_of(stay.target)
            ),
        )
        return bool(stay.end_min - stay.runs[0].begin_min >= least - 1e-6)

    def long_enough_at(self, place: int, stay: Stay) -> bool:
        """Say whether a stay put in a place is long enough: only the last may be what is left."""
        if any(each.target == stay.target for each in self.stays[place:]):
            return self._is_still_long_enough(stay)
        return self._long_enough(stay)

    def _is_still_long_enough(self, stay: Stay) -> bool:
        least_min = self.problem.contiguous_min[stay.target]
        return bool(stay.end_min - stay.runs[0].begin_min >= least_min - 1e-6)

    def _give_back(self, stay: Stay) -> None:
        for run in stay.runs:
            self.left[run.line] += run.count

    def put(self, place: int, stay: Stay) -> None:
        """Put a stay in its place; with a neighbour on the same target it is one."""
        for run in stay.runs:
            self.left[run.line] -= run.count
        self.stays.insert(place, stay)
        for at in (place + 1, place):
            if 0 < at < len(self.stays):
                before, after = self.stays[at - 1], self.stays[at]
                if without_break(before, after):
                    before.runs += after.runs
                    before.end_min = after.end_min
                    del self.stays[at]

    def set_out(self) -> None:
        """Let every stay begin no sooner than the way to its first exposure asks."""
        problem = self.problem
        here, leave_min = problem.pointing, problem.start_min
        for stay in self.stays:
            first = stay.runs[0]
            way_min = problem.travel.exact_min(here, leave_min, stay.target, first.begin_min)
            change_min = problem.lines[first.line].change_min
            stay.begin_min = max(leave_min, first.begin_min - change_min - way_min)
            here, leave_min = stay.target, stay.end_min

    # What it is worth

    def pins_worth(self) -> float:
        """Return what it counts to have begun the pinned targets when they were wanted."""
        problem = self.problem
        begins: dict[int, float] = {}
        for stay in reversed(self.stays):
            begins[stay.target] = stay.runs[0].begin_min
        return sum(
            float(pin_worths(problem, target, np.array(begins[target])))
            for target in problem.pins
            if target in begins
        )

    def _sample(self, stay: Stay, sampled: dict[int, set[int]]) -> float:
        """Return what share a visit counts: all but for a standard at an airmass sampled before."""
        problem = self.problem
        repeats = problem.repeats.get(stay.target)
        if repeats is None or repeats.spread is None:
            return 1.0
        at = problem.first + int(stay.runs[0].begin_min)
        part = int(repeats.spread.part(problem.night.airmass[stay.target, at : at + 1])[0])
        is_new = part not in sampled[stay.target]
        sampled[stay.target].add(part)
        return 1.0 if is_new else SAMPLED_SHARE

    def value(self) -> float:
        """Return what the stays are worth by the documented merit, exposure by exposure."""
        problem = self.problem
        total = 0.0
        sampled = {
            target: set(each.spread.sampled)
            for target, each in problem.repeats.items()
            if each.spread is not None
        }
        for stay in self.stays:
            share = self._sample(stay, sampled)
            for run in stay.runs:
                line = problem.lines[run.line]
                middles = (
                    run.begin_min + np.arange(run.count) * line.each_min + 0.5 * line.seconds / 60.0
                )
                # `worth` holds priority x quality already.
                quality = problem.worth[run.line, middles.astype(np.int64)].astype(float)
                total += float(exposure_worth(1, line.seconds, share) * quality.sum())
        for target, bonus in enumerate(problem.bonus):
            own = problem.lines_of(target)
            if bonus > 0.0 and not self.left[own].any():
                total += float(bonus)
        return total
