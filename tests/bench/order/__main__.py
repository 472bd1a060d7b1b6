"""How good orders are, against the proven limit and against others, on random nights.

Run as ``python -m tests.bench.order``; ``--nights 8 --sizes 20,50 --long`` change what is measured.
The seeds are not those the search was tuned on. Figures are percent of the proven limit and
milliseconds, all in one run on one machine.
"""

from __future__ import annotations

import argparse
import time
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np

from engine.order import Order, Problem, propose, upper_limit
from engine.order.construct import URGENT, VALUE_FIRST, Temper
from engine.order.propose import plain_order
from tests.bench.order.nights import random_night

# Nights for tuning have seeds from 1000 on.
FIRST_SEED = 50_000
LOADS = (0.5, 1.0, 2.0, 4.0)
STEADY_MIN = 60


@dataclass
class Column:
    """One method's results: shares of the limit and milliseconds, a night each."""

    shares: list[float] = field(default_factory=list)
    times_ms: list[float] = field(default_factory=list)

    def text(self) -> str:
        """Return mean, worst and median time as one cell."""
        shares = np.array(self.shares) * 100.0
        return f"{shares.mean():5.1f} ({shares.min():4.1f}) {np.median(self.times_ms):6.0f} ms"


def _ours(budget_ms: float) -> Callable[[Problem], float]:
    return lambda problem: propose(problem, budget_ms=budget_ms).value


def _plain(temper: Temper) -> Callable[[Problem], float]:
    return lambda problem: plain_order(problem, temper).value()


METHODS: dict[str, Callable[[Problem], float]] = {
    "value first": _plain(VALUE_FIRST),
    "urgency": _plain(URGENT),
    "ours 50 ms": _ours(50.0),
    "ours 200 ms": _ours(200.0),
    "ours 1 s": _ours(1000.0),
}


def main() -> None:
    """Measure and print the tables."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--nights", type=int, default=8, help="nights of each size")
    parser.add_argument("--sizes", default="20,50,100,200,500", help="numbers of targets")
    parser.add_argument("--no-steadiness", action="store_true", help="only the first table")
    arguments = parser.parse_args()
    sizes = [int(size) for size in arguments.sizes.split(",")]
    print("percent of the proven limit, mean (worst), and median time\n")
    print("targets  " + "  ".join(f"{name:>20}" for name in METHODS) + "   below a plain rule")
    for size in sizes:
        _print_quality(size, arguments.nights)
    if not arguments.no_steadiness:
        print(f"\nafter a change of seeing of 5 to 10 %: minutes of the next {STEADY_MIN} changed")
        for size in sizes:
            _print_steadiness(size, arguments.nights)


def _print_quality(size: int, nights: int) -> None:
    columns = {name: Column() for name in METHODS}
    beaten = 0
    for number in range(nights):
        problem = random_night(FIRST_SEED + number, size, LOADS[number % 4]).problem()
        limit = upper_limit(problem)
        if limit <= 0.0:
            continue
        for name, method in METHODS.items():
            began_s = time.perf_counter()
            columns[name].shares.append(method(problem) / limit)
            columns[name].times_ms.append((time.perf_counter() - began_s) * 1e3)
        plain = max(columns[name].shares[-1] for name in ("value first", "urgency"))
        ours = min(columns[name].shares[-1] for name in METHODS if name.startswith("ours"))
        beaten += ours < plain - 1e-9
    cells = "  ".join(column.text() for column in columns.values())
    print(f"{size:7d}  {cells}   {beaten} of {nights}", flush=True)


def _print_steadiness(size: int, nights: int) -> None:
    changed, kept, warm_ms = [], [], []
    for number in range(nights):
        night = random_night(FIRST_SEED + number, size, LOADS[number % 4])
        random = np.random.default_rng(number)
        before = propose(night.problem(), budget_ms=500.0)
        if not before.visits:
            continue
        from_mjd = before.visits[0].start_mjd
        factor = 1.0 + float(random.choice([-1.0, 1.0]) * random.uniform(0.05, 0.1))
        problem = night.problem(factor, from_mjd)
        after = propose(problem, before)
        fresh = propose(problem, budget_ms=500.0)
        same = [
            a == b
            for a, b in zip(_minutes(before, from_mjd), _minutes(after, from_mjd), strict=True)
        ]
        changed.append(1.0 - float(np.mean(same)))
        kept.append(after.value / fresh.value)
        warm_ms.append(after.compute_ms)
    print(
        f"{size:7d}  {np.mean(changed):6.1%} changed, {np.mean(kept):6.1%} of the value of a fresh "
        f"order searched for 500 ms, {np.median(warm_ms):4.0f} ms",
        flush=True,
    )


def _minutes(order: Order, from_mjd: float) -> list[str | None]:
    """Return the target of each minute from a moment on; None between visits."""
    moments = from_mjd + (np.arange(STEADY_MIN) + 0.5) / 1440.0
    return [
        next((v.target for v in order.visits if v.start_mjd <= at < v.end_mjd), None)
        for at in moments
    ]


if __name__ == "__main__":
    main()
