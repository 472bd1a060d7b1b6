"""Planning again: what a little change of seeing changes, and how long it takes."""

from __future__ import annotations

import time
from collections.abc import Callable
from functools import partial

import numpy as np

from engine.order import Order, propose, refine, retime
from tests.bench.order.nights import RandomNight, load_of, random_night

HOUR_MIN = 60
BEFORE_MS = 500.0
REPEATS = 5


def steady_table(sizes: list[int], nights: int, first_seed: int) -> None:
    """Print how much of the next hour changes, and how much of a cold order's value is kept."""
    print(f"after a change of seeing of 5 to 10 %, {nights} nights a size: percent of the next")
    print("hour's minutes that changed, and of the value of an order made cold\n")
    print("targets    warm: changed  worst   value  worst    cold: changed")
    for size in sizes:
        rows = []
        for number in range(nights):
            night = random_night(first_seed + number, size, load_of(number))
            before = propose(night.problem(), budget_ms=BEFORE_MS)
            if before.visits:
                rows.append(_after_a_change(night, before, number))
        changed, value, cold = np.array(rows).T * 100.0
        print(
            f"{size:7d} {changed.mean():16.1f} {changed.max():6.1f} "
            f"{value.mean():7.1f} {value.min():6.1f} {cold.mean():16.1f}",
            flush=True,
        )


def _after_a_change(night: RandomNight, before: Order, number: int) -> tuple[float, float, float]:
    """Return the share changed, the value against a cold order's, and the share that changes."""
    random = np.random.default_rng(number)
    from_mjd = before.visits[0].start_mjd
    factor = 1.0 + float(random.choice([-1.0, 1.0]) * random.uniform(0.05, 0.1))
    problem = night.problem(factor, from_mjd)
    after, cold = propose(problem, before), propose(problem)
    return (
        _changed(before, after, from_mjd),
        after.value / cold.value,
        _changed(before, cold, from_mjd),
    )


def _changed(before: Order, after: Order, from_mjd: float) -> float:
    pairs = zip(_minutes(before, from_mjd), _minutes(after, from_mjd), strict=True)
    return float(np.mean([one != other for one, other in pairs]))


def _minutes(order: Order, from_mjd: float) -> list[str | None]:
    """Return the target of each minute from a moment on; None between visits."""
    moments = from_mjd + (np.arange(HOUR_MIN) + 0.5) / 1440.0
    return [
        next((v.target for v in order.visits if v.start_mjd <= at < v.end_mjd), None)
        for at in moments
    ]


def warm_table(sizes: list[int], nights: int, first_seed: int) -> None:
    """Print how long it takes to plan again with an order in force, each way there is."""
    print(f"milliseconds to plan again, {nights} nights a size, each {REPEATS} times:")
    print("median, 95 %, and in brackets the median of this process's own time\n")
    print(f"targets  {'cold':>20} {'warm':>20} {'timed anew only':>20} {'an idle moment':>20}")
    for size in sizes:
        times: list[list[tuple[float, float]]] = [[], [], [], []]
        for number in range(nights):
            night = random_night(first_seed + number, size, load_of(number))
            before = propose(night.problem(), budget_ms=BEFORE_MS)
            problem = night.problem(1.06)
            ways: tuple[Callable[[], object], ...] = (
                partial(propose, problem),
                partial(propose, problem, before),
                partial(retime, problem, before),
                partial(refine, problem, before, seed=0),
            )
            for _ in range(REPEATS):
                # The tables of the night are kept by the program, so they are not timed here.
                for place, way in enumerate(ways):
                    wall_s, own_s = time.perf_counter(), time.process_time()
                    way()
                    times[place].append((time.perf_counter() - wall_s, time.process_time() - own_s))
        cells = []
        for column in times:
            wall, own = np.array(column).T * 1e3
            cells.append(
                f"{np.median(wall):7.0f} {np.percentile(wall, 95):5.0f} ({np.median(own):4.0f})"
            )
        print(f"{size:7d}  " + " ".join(f"{cell:>20}" for cell in cells), flush=True)
