"""The search for an order: first orders, made better until the time is up, then timed exactly.

The best of several is returned, the plain rules among them. When there is an order in force it is
carried on, and left only for a clear gain: an observer can't follow a list that reshuffles.
"""

from __future__ import annotations

import time
from dataclasses import replace

import numpy as np

from engine.order.blocks import TICKS_PER_MIN, Blocks, cut
from engine.order.construct import TEMPERS, URGENT, VALUE_FIRST, Start, Temper, Turn, greedies
from engine.order.filling import GAP_MIN, fill
from engine.order.improve import Effort, Search
from engine.order.left_out import left_out
from engine.order.order import Order, PlacedExposures, Visit
from engine.order.pins import PIN_WORTH
from engine.order.prices import price_of_time
from engine.order.problem import Problem
from engine.order.reasons import reason_for
from engine.order.sequence import Timed
from engine.order.stays import Stay
from engine.order.timeline import Timeline
from engine.times import MINUTES_PER_DAY

# What keeping the order in force is worth against one made afresh: common practice, no source.
KEEPING_BONUS = 0.05
# The order in force is changed in itself only for more than this share of its value.
HYSTERESIS = 0.003
# And what the search makes of it is taken only for more than this.
CLEAR_GAIN = 0.01
# An order that loses more than this share of its minutes is made afresh.
BROKEN_SHARE = 0.05
# Pinned targets that are a second or two apart from their time are as good as in time.
PIN_MATTERS = PIN_WORTH / 1000.0
# Two first orders are made exact beside the one that was searched: the plain rules, always.
PLAIN = (VALUE_FIRST, URGENT)
# Of the time used before the search, the share that is kept back for what comes after it.
RESERVE = 0.8
# Milliseconds when none are given: for lists up to so many targets, and for longer ones.
SHORT_LIST = 100
IDLE_MS = 50.0
COLD_MS, WARM_MS = (50.0, 200.0), (10.0, 40.0)


def propose(
    problem: Problem,
    in_force: Order | None = None,
    *,
    afresh: bool = False,
    budget_ms: float | None = None,
    steps: int | None = None,
    seed: int = 0,
) -> Order:
    """Return an order for the rest of the night; the best found, never an unlawful one.

    An order in force is carried on and changed for clear gains alone; ``afresh`` tries one made
    from nothing against it, which is done anyhow when much of it has become impossible.

    The search stops after ``budget_ms`` or ``steps``, whichever comes first. With ``steps`` alone
    the same seed gives the same order on every machine; with neither, the time fits the list.
    """
    begun_s = time.perf_counter()
    if budget_ms is None and steps is None:
        longer = len(problem.targets) > SHORT_LIST
        budget_ms = (COLD_MS if in_force is None else WARM_MS)[longer]
    until_s = None if budget_ms is None else begun_s + budget_ms / 1e3
    effort = Effort(until_s=until_s, steps=steps, begun_s=begun_s)
    blocks = cut(problem)
    if in_force is not None and in_force.visits:
        timeline = _carried_on(problem, blocks, in_force, effort, seed, afresh)
    else:
        timeline = _afresh(problem, blocks, effort, seed)
    return _as_order(problem, timeline, begun_s)


def retime(problem: Problem, in_force: Order) -> Order | None:
    """Return an order with its visits timed anew and its gaps filled, without any search.

    It takes a tenth of the time. None when what is ahead can't be kept, or the observer wants
    something first: then it has to be searched.
    """
    begun_s = time.perf_counter()
    kept = Timeline(problem)
    if kept.repeat(in_force) >= BROKEN_SHARE:
        return None
    if not _begins_as_wanted(kept) or _lacks_pinned(kept):
        return None
    _complete(kept)
    return _as_order(problem, kept, begun_s)


def refine(problem: Problem, in_force: Order, *, seed: int, budget_ms: float = IDLE_MS) -> Order:
    """Return a clearly better order than the one in force, or that one: for idle moments.

    Each seed looks elsewhere; what is found is worth a share of `CLEAR_GAIN` more, or is let go.
    """
    begun_s = time.perf_counter()
    effort = Effort(until_s=begun_s + budget_ms / 1e3, begun_s=begun_s)
    kept = Timeline(problem)
    kept.repeat(in_force)
    _complete(kept)
    blocks = cut(problem)
    search = _search_from(problem, blocks, in_force, seed)
    better = _exact(problem, blocks, search.run(effort.with_reserve(RESERVE)))
    return _as_order(problem, better, begun_s) if _is_better(better, kept, CLEAR_GAIN) else in_force


def _begins_as_wanted(timeline: Timeline) -> bool:
    """Say whether an order begins with what the observer wants first, if she wants anything."""
    first = timeline.problem.rules.first
    if first is None:
        return True
    wanted = timeline.problem.night.target_index(first)
    return bool(timeline.stays) and timeline.stays[0].target == wanted


def _lacks_pinned(timeline: Timeline) -> bool:
    """Say whether an order leaves out a pinned target of which something may be exposed."""
    problem, visited = timeline.problem, {stay.target for stay in timeline.stays}
    return any(
        (problem.run_end[problem.lines_of(target)] >= 0).any()
        for target in problem.pins
        if target not in visited
    )


def _as_order(problem: Problem, timeline: Timeline, begun_s: float) -> Order:
    visits = [_visit(problem, stay) for stay in timeline.stays]
    visits = [
        replace(visit, reason=reason_for(problem, stay.target, visit))
        for visit, stay in zip(visits, timeline.stays, strict=True)
    ]
    return Order(
        from_mjd=problem.from_mjd,
        until_mjd=problem.mjd_at(problem.minutes - 1),
        value=timeline.value(),
        visits=tuple(visits),
        left_out=left_out(problem, visits),
        compute_ms=(time.perf_counter() - begun_s) * 1e3,
    )


def plain_order(problem: Problem, temper: Temper) -> Timeline:
    """Return the order of one plain rule, without any search: what ours is measured against."""
    blocks = cut(problem)
    start = _start(problem, blocks)
    price = np.zeros(blocks.ticks, dtype=np.float32)
    turn = greedies(blocks, problem.travel, price, start, (temper,))[0]
    return _exact(problem, blocks, _as_timed(problem, blocks, start, turn))


def _carried_on(
    problem: Problem, blocks: Blocks, in_force: Order, effort: Effort, seed: int, afresh: bool
) -> Timeline:
    """Return the order in force carried on, changed for clear gains alone.

    A fresh order is tried when it is asked for or what is ahead has become impossible, and taken
    for a gain of more than the bonus for keeping.
    """
    kept = Timeline(problem)
    lost_share = kept.repeat(in_force)
    _complete(kept)
    search = _search_from(problem, blocks, in_force, seed)
    better = _exact(problem, blocks, search.run(effort.with_reserve(RESERVE), 0.0, HYSTERESIS))
    if _is_better(better, kept, CLEAR_GAIN):
        kept = better
    if lost_share < BROKEN_SHARE and _begins_as_wanted(kept) and not afresh:
        return kept
    fresh = _afresh(problem, blocks, effort, seed)
    # Who has just decided something expects the order to change.
    return fresh if _is_better(fresh, kept, CLEAR_GAIN if afresh else KEEPING_BONUS) else kept


def _search_from(problem: Problem, blocks: Blocks, in_force: Order, seed: int) -> Search:
    """Return the search that goes on from the order in force."""
    start = _start(problem, blocks)
    ahead = _turn_ahead(problem, blocks, in_force, start)
    return Search(blocks, problem.travel, start, ahead, seed)


def _complete(timeline: Timeline) -> None:
    """Fill what is free between the stays, and let each set out in time."""
    fill(timeline)
    timeline.set_out()


def _is_better(one: Timeline, other: Timeline, by_share: float) -> bool:
    """Say whether an order does more of what the observer wants, or is worth so much more."""
    if _begins_as_wanted(one) != _begins_as_wanted(other):
        return _begins_as_wanted(one)
    ahead = one.pins_worth() - other.pins_worth()
    if abs(ahead) > PIN_MATTERS:
        return ahead > 0.0
    return one.value() > (1.0 + by_share) * other.value()


def _turn_ahead(problem: Problem, blocks: Blocks, order: Order, start: Start) -> Turn:
    """Return the blocks that the visits of an order still ahead stand for, in their turn."""
    known = {target.name: index for index, target in enumerate(problem.targets)}
    free = [
        np.flatnonzero(blocks.target == index).tolist() for index in range(len(problem.targets))
    ]
    found: list[tuple[int, int]] = []
    for block in start.first:
        free[int(blocks.target[block])].remove(block)
        found.append((block, start.tick))
    for visit in order.visits:
        if visit.end_mjd <= problem.from_mjd or visit.target not in known:
            continue
        first_mjd = max(visit.exposures[0].start_mjd, problem.from_mjd)
        minute = (first_mjd - problem.mjd_at(0.0)) * MINUTES_PER_DAY
        left_min = (visit.end_mjd - first_mjd) * MINUTES_PER_DAY
        waiting = free[known[visit.target]]
        # A visit that fills a gap is shorter than any block: the filling finds it again.
        while waiting and left_min > 0.6 * blocks.minutes[waiting[0]]:
            block = int(waiting.pop(0))
            found.append((block, min(round(minute * TICKS_PER_MIN), blocks.ticks)))
            minute += float(blocks.minutes[block])
            left_min -= float(blocks.minutes[block])
    return Turn(tuple(block for block, _ in found), tuple(tick for _, tick in found))


def _afresh(problem: Problem, blocks: Blocks, effort: Effort, seed: int) -> Timeline:
    start = _start(problem, blocks)
    price = price_of_time(blocks, start.tick)
    turns = greedies(blocks, problem.travel, price, start, TEMPERS)
    worths = [_worth(blocks, turn) for turn in turns]
    search = Search(blocks, problem.travel, start, turns[int(np.argmax(worths))], seed)
    found = search.run(effort.with_reserve(RESERVE))
    timeline = _exact(problem, blocks, found)
    for temper in PLAIN:
        # Once gaps are filled, a plain rule may come out ahead from well behind.
        timed = _as_timed(problem, blocks, start, turns[TEMPERS.index(temper)])
        if not _may_reach(problem, blocks, timed, timeline.value()):
            continue
        plain = _exact(problem, blocks, timed)
        if _is_better(plain, timeline, 0.0):
            timeline = plain
    return timeline


def _may_reach(problem: Problem, blocks: Blocks, turn: Timed, value: float) -> bool:
    """Say whether a turn could be worth so much if all its idle time were filled at the best rate.

    Times are rounded and filling may finish plans: a tenth of what it fills is allowed for that.
    """
    if problem.pins or problem.repeats or not turn.blocks:
        return True
    begins = np.append(np.array(turn.ticks), blocks.ticks)
    ends = np.array(turn.ticks) + blocks.minutes[list(turn.blocks)] * TICKS_PER_MIN
    there = blocks.target[list(turn.blocks)]
    minutes = np.minimum(ends, blocks.ticks - 1).astype(np.int64) // TICKS_PER_MIN
    ways = np.append(problem.travel.between(there[:-1], there[1:], minutes[:-1]), 0.0)
    idle = np.append(
        begins[0] - problem.start_min * TICKS_PER_MIN, begins[1:] - ends - ways * TICKS_PER_MIN
    )
    rates = np.array([line.seconds / line.each_min for line in problem.lines]) / TICKS_PER_MIN
    best = np.repeat((problem.worth * rates.astype(np.float32)[:, None]).max(axis=0), TICKS_PER_MIN)
    filled = sum(
        ticks * float(best[round(end) : begin].max(initial=0.0))
        for ticks, end, begin in zip(
            idle, [problem.start_min * TICKS_PER_MIN, *ends], begins, strict=True
        )
        if ticks >= GAP_MIN * TICKS_PER_MIN
    )
    return bool(turn.value + 1.1 * filled > value)


def _worth(blocks: Blocks, turn: Turn) -> float:
    return float(blocks.value[list(turn.blocks), list(turn.ticks)].sum()) + blocks.finishing(
        list(turn.blocks)
    )


def _start(problem: Problem, blocks: Blocks) -> Start:
    """Return where the order begins; what the observer wants first is held there."""
    first: tuple[int, ...] = ()
    if problem.rules.first is not None:
        wanted = problem.night.target_index(problem.rules.first)
        own = np.flatnonzero(blocks.target == wanted)[: None if problem.rules.hold else 1]
        first = tuple(int(block) for block in own)
    tick = min(int(np.ceil(problem.start_min * TICKS_PER_MIN)), blocks.ticks)
    return Start(problem.pointing, tick, first)


def _as_timed(problem: Problem, blocks: Blocks, start: Start, turn: Turn) -> Timed:
    return Search(blocks, problem.travel, start, turn, 0).best


def _exact(problem: Problem, blocks: Blocks, timed: Timed) -> Timeline:
    timeline = Timeline(problem)
    timeline.place(blocks, timed)
    _complete(timeline)
    return timeline


def _visit(problem: Problem, stay: Stay) -> Visit:
    night, target = problem.night, problem.targets[stay.target]
    first = night.index_at(problem.mjd_at(stay.runs[0].begin_min))
    last = night.index_at(problem.mjd_at(stay.end_min))
    sizes = [
        problem.outlook.image_size_arcsec[
            problem.lines[run.line].filter,
            stay.target,
            night.index_at(problem.mjd_at(run.begin_min)),
        ]
        for run in stay.runs
    ]
    return Visit(
        target=target.name,
        start_mjd=problem.mjd_at(stay.begin_min),
        end_mjd=problem.mjd_at(stay.end_min),
        exposures=tuple(
            PlacedExposures(
                filter=night.observatory.filters[problem.lines[run.line].filter].name,
                seconds=problem.lines[run.line].seconds,
                count=run.count,
                start_mjd=problem.mjd_at(run.begin_min),
            )
            for run in stay.runs
        ),
        airmass_start=float(night.airmass[stay.target, first]),
        airmass_end=float(night.airmass[stay.target, last]),
        image_size_arcsec=float(max(sizes)),
    )
