"""What blocks leave free, filled exposure by exposure: each gap with the runs worth most in it."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.order.problem import Problem
from engine.order.stays import Run, Stay, without_break
from engine.order.timeline import Timeline

Floats = NDArray[np.float64]

# Gaps shorter than this are not worth filling; how often in each, and at which shares of it.
GAP_MIN, FILLINGS = 0.8, 400
SHARES = (0.0, 0.05, 0.1, 0.2, 0.35, 0.5, 0.65, 0.8)


def fill(timeline: Timeline) -> None:
    """Fill every gap of a timeline with the exposures worth most in it, one run at a time."""
    if timeline.problem.lines:
        _Filling(timeline).fill()


class _Filling:
    """The filling of one timeline."""

    def __init__(self, timeline: Timeline) -> None:
        self._timeline, self._problem = timeline, timeline.problem
        self._tables = _LineTables.of(timeline.problem)

    def fill(self) -> None:
        """Fill every gap."""
        waiting = [(place, 0) for place in range(len(self._timeline.stays), -1, -1)]
        for _ in range(FILLINGS):
            if not waiting:
                return
            place, tried = waiting.pop()
            stay = self._best_in_gap(place)
            if stay is None:
                continue
            stays = len(self._timeline.stays)
            self._timeline.put(place, stay)
            grown = len(self._timeline.stays) - stays
            waiting = [(at + grown if at > place else at, n) for at, n in waiting]
            waiting += [(place + 1, tried + 1)] if grown > 0 else []
            waiting += [(place, tried + 1)] if tried < 12 else []

    def _best_in_gap(self, place: int) -> Stay | None:
        problem = self._problem
        before, after = self._around(place)
        begin_min = before.end_min if before else problem.start_min
        end_min = after.runs[0].begin_min if after else float(problem.minutes - 1)
        if end_min - begin_min < GAP_MIN:
            return None
        here = before.target if before else problem.pointing
        left = np.flatnonzero(
            (self._timeline.left > 0) & ~self._tables.repeated & self._usable(begin_min, end_min)
        )
        if not left.size:
            return None
        tables = self._tables.only(left)
        at = np.array(int(begin_min))
        to = problem.travel.between(np.array(here), tables.target, at).astype(float)
        onward: Floats = np.zeros(len(to))
        if after is not None:
            change = problem.lines[after.runs[0].line].change_min
            way = problem.travel.between(tables.target, np.array(after.target), at)
            onward = way.astype(float) + change
        opens_min = max(begin_min, float(self._opens(left, begin_min)) - to.max())
        moments = opens_min + np.array(SHARES)[None] * (end_min - opens_min)
        start: Floats = moments + to[:, None] + tables.change[:, None]
        minute = np.minimum(start.astype(np.int64), problem.minutes - 1)
        rows = left[:, None]
        limit: Floats = np.minimum(
            problem.run_end[rows, minute] + problem.readout_min, end_min - onward[:, None]
        )
        fit: Floats = np.floor((limit - start) / tables.each[:, None])
        fit = np.asarray(np.clip(fit, 0, self._timeline.left[left][:, None]), dtype=float)
        middle = np.minimum(
            (start + 0.5 * fit * tables.each[:, None]).astype(np.int64), problem.minutes - 1
        )
        worth: Floats = np.where(
            problem.run_end[rows, minute] >= 0, problem.worth[rows, middle], 0.0
        )
        worth = worth * fit * tables.seconds[:, None]
        tries = _Tries(left, worth, start, fit)
        return self._first_lawful(place, tries, end_min)

    def _around(self, place: int) -> tuple[Stay | None, Stay | None]:
        """Return the stays before and after a gap; None at the ends of the night."""
        stays = self._timeline.stays
        return stays[place - 1] if place else None, stays[place] if place < len(stays) else None

    def _usable(self, begin_min: float, end_min: float) -> NDArray[np.bool_]:
        """Return which lines (L,) may be exposed at some minute of a gap."""
        begin, end = int(begin_min), int(end_min) + 1
        return np.asarray((self._problem.run_end[:, begin:end] >= 0).any(axis=1))

    def _opens(self, lines: NDArray[np.int64], begin_min: float) -> int:
        """Return the first minute of a gap in which one of some lines may be exposed."""
        usable = (self._problem.run_end[lines, int(begin_min) :] >= 0).any(axis=0)
        return int(begin_min) + int(np.argmax(usable))

    def _first_lawful(self, place: int, tries: _Tries, end_min: float) -> Stay | None:
        """Return the best of the tried runs that holds to the second; None when none does."""
        for flat in np.argsort(-tries.worth, axis=None)[:12]:
            row, moment = divmod(int(flat), tries.worth.shape[1])
            if tries.worth[row, moment] <= 0.0:
                return None
            line, count = int(tries.line[row]), int(tries.fit[row, moment])
            stay = self._stay_in_gap(place, line, count, float(tries.start_min[row, moment]))
            if stay is not None and stay.end_min <= end_min:
                return stay
        return None

    def _stay_in_gap(self, place: int, line: int, count: int, start_min: float) -> Stay | None:
        problem, each = self._problem, self._problem.lines[line]
        before, after = self._around(place)
        leave_min = before.end_min if before else problem.start_min
        here = before.target if before else problem.pointing
        run = self._timeline.run(here, leave_min, line, count, start_min - each.change_min)
        while run is not None and run.count > 0:
            end_min = run.begin_min + run.count * each.each_min
            stay = Stay(each.target, leave_min, end_min, [run])
            if after is None or self._reaches(end_min, each.target, after):
                if self._is_one_with(place, stay) or self._timeline.long_enough_at(place, stay):
                    return stay
                return None
            run = Run(run.line, run.count - 1, run.begin_min)
        return None

    def _is_one_with(self, place: int, stay: Stay) -> bool:
        """Say whether a stay put in a place goes on with a neighbour's without a break."""
        before, after = self._around(place)
        return (before is not None and without_break(before, stay)) or (
            after is not None and without_break(stay, after)
        )

    def _reaches(self, end_min: float, target: int, after: Stay) -> bool:
        first = after.runs[0]
        way_min = self._problem.travel.exact_min(target, end_min, after.target, first.begin_min)
        change_min = self._problem.lines[first.line].change_min
        return end_min + way_min + change_min <= first.begin_min + 1e-9


@dataclass(frozen=True, slots=True)
class _Tries:
    """Runs tried in a gap: lines (R,), and worth, begin and exposures (R, M) of each."""

    line: NDArray[np.int64]
    worth: Floats
    start_min: Floats
    fit: Floats


@dataclass(frozen=True, slots=True)
class _LineTables:
    """The lines of a problem as columns."""

    target: NDArray[np.int64]
    change: Floats
    each: Floats
    seconds: Floats
    repeated: NDArray[np.bool_]

    @classmethod
    def of(cls, problem: Problem) -> _LineTables:
        lines = problem.lines
        return cls(
            np.array([line.target for line in lines], dtype=np.int64),
            np.array([line.change_min for line in lines]),
            np.array([line.each_min for line in lines]),
            np.array([line.seconds for line in lines]),
            np.array([line.target in problem.repeats for line in lines], dtype=bool),
        )

    def only(self, rows: NDArray[np.int64]) -> _LineTables:
        """Return some of the lines."""
        return _LineTables(
            self.target[rows],
            self.change[rows],
            self.each[rows],
            self.seconds[rows],
            self.repeated[rows],
        )
