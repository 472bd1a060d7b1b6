"""A proven upper limit to what any order can be worth, by mixed-integer programming.

The night is cut into stretches of a few minutes. An unknown y(l, s) says how many minutes of
stretch s line l of a plan gets; it may be any fraction. An unknown z(n), 0 or 1, says whether a
plan is finished, which takes all the minutes of all its lines. Every lawful order turns into such
a solution of at least its own worth, so the best solution is a limit to all orders:

- An exposure takes its seconds, its readout, and a share of the filter's change and of the
  shortest way to its target that any order pays: one visit pays each once, for at most all that is
  left. Shares are spread evenly, so a visit's minutes stand at most that visit's overheads away
  from where the exposures are. A minute's worth is therefore the greatest worth within that, half
  the seconds exposed and the readout of the stretch.
- An exposure ends by the last minute of any use, so nothing is read out later than one readout
  after that: there the room ends.
- A single exposure that fills a gap is a visit like any other; nothing here needs whole blocks.
- Limits hold within that reach; slews beyond the shortest, the meridian, unbroken runs and the gaps
  of a series are left out, which can only raise the limit. So does sharing a stretch between many
  targets; that their worth is not taken at the exact middle costs little (`tests.bench.order`).

HiGHS solves it, through scipy. What is returned is never its best solution but its own proven
limit to all solutions, which holds also when the time given to it ran out.
"""

from __future__ import annotations

import os
import sys
from collections.abc import Iterator
from contextlib import contextmanager

import numpy as np
from numpy.typing import NDArray

from engine.errors import WarmroomError
from engine.order.problem import Problem

Floats = NDArray[np.float64]

# Finer stretches hold a plan closer to its own best minutes, and cost time: minutes by how many
# lines of plans there are at most.
STRETCHES_MIN = ((60, 1), (500, 2))
LONGEST_STRETCH_MIN = 5
# How long HiGHS may go on closing the gap, and the gap at which it stops.
PATIENCE_S, CLOSE_ENOUGH = 20.0, 5e-4
# HiGHS holds constraints and optimality to 1e-6 and 1e-7: so much is added to be safe.
SAFETY = 1e-5


class NoSolver(WarmroomError):
    """The proven limit was asked for without scipy."""


def upper_limit(problem: Problem, stretch_min: int | None = None) -> float:
    """Return a limit that the value of no order exceeds; NoSolver when scipy is absent.

    Whatever ``stretch_min`` is, the limit holds; the longer, the looser and the sooner found.
    """
    if not problem.lines:
        return 0.0
    if stretch_min is None:
        fitting = (each for most, each in STRETCHES_MIN if len(problem.lines) <= most)
        stretch_min = next(fitting, LONGEST_STRETCH_MIN)
    overhead_min = _overheads_min(problem)
    need_min = np.array([line.count * line.each_min for line in problem.lines]) + overhead_min
    rate = _rates(problem, overhead_min, need_min, stretch_min)
    return _solved(problem, rate, need_min, _rooms_min(problem, stretch_min)) * (1.0 + SAFETY)


def _overheads_min(problem: Problem) -> Floats:
    """Return the minutes (L,) of changes and ways that all of a line can't be taken without."""
    lines, travel = problem.lines, problem.travel
    targets = np.array([line.target for line in lines])
    to = travel.tables.copy()
    staying = np.arange(to.shape[1])
    to[:, staying, staying] = np.inf
    # An altazimuth mount's tables stand minutes apart; only settling is certain.
    settle_min = problem.night.observatory.telescope.settle_s / 60.0
    way = np.full(to.shape[1], settle_min) if travel.step_min else to.min(axis=(0, 1)).astype(float)
    # The target pointed at may be free.
    way[problem.pointing] = 0.0
    own_min = np.array([line.count * line.each_min for line in lines])
    sums = np.bincount(targets, weights=own_min, minlength=len(problem.targets))
    changes = np.array([line.change_min for line in lines])
    return np.asarray(changes + way[targets] * own_min / sums[targets])


def _rooms_min(problem: Problem, stretch_min: int) -> Floats:
    begins = np.arange(0, problem.minutes, stretch_min, dtype=float)
    # The last two columns are the last minute of any use and one beyond it.
    ends = np.minimum(begins + stretch_min, problem.minutes - 2.0 + problem.readout_min)
    ends[-1] = problem.minutes - 2.0 + problem.readout_min
    return np.asarray(np.maximum(ends - np.maximum(begins, problem.start_min), 0.0))


def _rates(problem: Problem, overhead_min: Floats, need_min: Floats, stretch_min: int) -> Floats:
    """Return what a minute of each stretch is worth to each line (L, S); 0 where none may be."""
    lines = problem.lines
    stretches = -(-problem.minutes // stretch_min)
    rate = np.zeros((len(lines), stretches))
    padded = np.zeros((len(lines), stretches * stretch_min))
    padded[:, : problem.minutes] = problem.worth
    for place, line in enumerate(lines):
        shift_min = sum(overhead_min[other] for other in problem.lines_of(line.target))
        to_middle_min = 0.5 * line.seconds / 60.0 + problem.readout_min
        reach = int(np.ceil(to_middle_min + shift_min)) + 1
        around = np.lib.stride_tricks.sliding_window_view(
            np.pad(padded[place], reach), stretch_min + 2 * reach
        )[::stretch_min]
        best = around.max(axis=1)[:stretches]
        rate[place] = best * line.seconds * line.count / need_min[place]
    return rate


@contextmanager
def _stdout_kept_clean() -> Iterator[None]:
    """Send what HiGHS prints whatever it is told, by way of C, to stderr: stdout is for JSON."""
    sys.stdout.flush()
    kept = os.dup(1)
    os.dup2(2, 1)
    try:
        yield
    finally:
        os.dup2(kept, 1)
        os.close(kept)


def _solved(problem: Problem, rate: Floats, need_min: Floats, room_min: Floats) -> float:
    """Return HiGHS's limit to the best use of the stretches' room."""
    try:
        from scipy.optimize import Bounds, LinearConstraint, milp
        from scipy.sparse import coo_array
    except ImportError:
        raise NoSolver(
            "the proven limit needs scipy: install warmroom with its extra 'bound', "
            "or ask without --bound"
        ) from None
    line, stretch = np.nonzero(rate)
    (lines, stretches), minutes = rate.shape, len(line)
    if not minutes:
        return 0.0
    finishable = np.flatnonzero(problem.bonus > 0.0)
    finishing = {int(target): minutes + place for place, target in enumerate(finishable)}
    # Minutes of a line: at most what it needs, and all of it when its plan is finished.
    entries = [(np.ones(minutes), stretch, np.arange(minutes))]
    entries += [(np.ones(minutes), stretches + line, np.arange(minutes))]
    entries += [(-np.ones(minutes), stretches + lines + line, np.arange(minutes))]
    held = [p for p, each in enumerate(problem.lines) if each.target in finishing]
    columns = np.array([finishing[problem.lines[p].target] for p in held], dtype=int)
    entries += [(need_min[held], stretches + lines + np.array(held, dtype=int), columns)]
    values, rows, across = (np.concatenate([e[i] for e in entries]) for i in range(3))
    shape = (stretches + 2 * lines, minutes + len(finishable))
    matrix = coo_array((values, (rows, across)), shape=shape).tocsr()
    most = np.concatenate([room_min, need_min, np.zeros(lines)])
    whole = np.concatenate([np.zeros(minutes), np.ones(len(finishable))])
    with _stdout_kept_clean():
        solved = milp(
            -np.concatenate([rate[line, stretch], problem.bonus[finishable]]),
            constraints=LinearConstraint(matrix, -np.inf, most),
            integrality=whole,
            bounds=Bounds(0.0, np.where(whole > 0.0, 1.0, np.inf)),
            options={"time_limit": PATIENCE_S, "mip_rel_gap": CLOSE_ENOUGH},
        )
    if solved.mip_dual_bound is None or not np.isfinite(solved.mip_dual_bound):
        raise WarmroomError(f"the proven limit could not be worked out: {solved.message}")
    return -float(solved.mip_dual_bound)
