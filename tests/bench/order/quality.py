"""Value as percent of the proven limit, and time, for ours and for the plain rules."""

from __future__ import annotations

import time
from collections.abc import Callable
from functools import partial

import numpy as np

from engine.order import Problem, propose, upper_limit
from engine.order.construct import URGENT, VALUE_FIRST, Temper
from engine.order.propose import plain_order
from tests.bench.order.column import Column
from tests.bench.order.nights import load_of, random_night

Method = Callable[[Problem], float]


def _ours(budget_ms: float | None) -> Method:
    return lambda problem: propose(problem, budget_ms=budget_ms).value


def _plain(temper: Temper) -> Method:
    return lambda problem: plain_order(problem, temper).value()


PLAIN: dict[str, Method] = {
    "best value first": _plain(VALUE_FIRST),
    "value with urgency": _plain(URGENT),
}
# Cold takes what the program itself takes when nothing is in force.
OURS: dict[str, Method] = {"ours, cold": _ours(None), "ours, 1 s": _ours(1000.0)}
HEAD = f"{'targets':>7}  {'method':20} {'mean':>5} {'worst':>6} {'median ms':>9} {'95 %':>5} (own)"


def table(sizes: list[int], nights: int, first_seed: int) -> None:
    """Print a line for each size and method, and how often ours was beaten."""
    print(f"percent of the proven limit, {nights} nights a size\n\n{HEAD}")
    for size in sizes:
        columns = {name: Column() for name in PLAIN | OURS}
        limits_s = []
        for number in range(nights):
            problem = random_night(first_seed + number, size, load_of(number)).problem()
            began_s = time.perf_counter()
            limit = upper_limit(problem)
            limits_s.append(time.perf_counter() - began_s)
            if limit <= 0.0:
                continue
            for name, method in (PLAIN | OURS).items():
                columns[name].timed(partial(method, problem), limit)
        print_size(size, columns)
        print(f"{'':7}  the limit itself took {np.median(limits_s):.1f} s\n", flush=True)


def print_size(size: int, columns: dict[str, Column]) -> None:
    """Print each method's line, and on how many nights ours was below any other."""
    for name, column in columns.items():
        print(f"{size:7d}  {name:20} {column.quality()} {column.times()}")
    for name in OURS:
        others = zip(*(columns[n].shares for n in columns if n not in OURS), strict=True)
        pairs = list(zip(columns[name].shares, others, strict=True))
        beaten = sum(max(theirs) > own + 1e-9 for own, theirs in pairs)
        print(f"{'':7}  {name}: below any other on {beaten} of {len(pairs)} nights")
