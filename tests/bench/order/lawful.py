"""Thousands of orders before the checker that shares no code with the search.

Run as ``python -m tests.bench.order.lawful 1000``: so many random nights. On each, an order is made
from nothing under random decisions of an observer, carried on from the begin of a random later
visit under another seeing, and timed anew; half the nights hold series of visits and standards.
Every fault is printed with the seed of its night.
"""

from __future__ import annotations

import argparse
from collections import Counter

import numpy as np

from engine.order import Order, Problem, Rules, build_problem, propose, retime
from tests.bench.order.nights import RandomNight, random_night, with_series
from tests.engine.lawful import faults

FIRST_SEED = 90_000
SIZES, LOADS = (3, 8, 15, 30, 60), (0.3, 0.5, 1.0, 2.0, 4.0)
SEEING_FACTORS = (0.9, 1.0, 1.15)


def decided(random: np.random.Generator, night: RandomNight) -> Rules:
    """Return what an observer may have decided: usually one or two things, sometimes nothing."""
    names = [target.name for target in night.night.targets]
    mjd = night.night.mjd

    def some(share: float) -> list[str]:
        return [str(random.choice(names))] if random.random() < share else []

    filters = [each.name for each in night.night.observatory.filters]
    first = next(iter(some(0.3)), None)
    return Rules(
        dropped=frozenset(some(0.3)),
        put_off={name: float(random.choice(mjd)) for name in some(0.3)},
        forbidden_filters=frozenset(random.choice(filters, size=int(random.random() < 0.15))),
        first=first,
        hold=first is not None and bool(random.random() < 0.5),
        pinned={name: float(random.choice(mjd)) for name in some(0.3)},
    )


def problem_of(
    night: RandomNight, rules: Rules, factor: float, from_mjd: float, pointing: str | None
) -> Problem:
    """Return a random night from a moment (UTC MJD) on, under rules and a factor of the seeing."""
    return build_problem(
        night.night,
        night.outlook(factor),
        night.plans,
        rules,
        from_mjd=from_mjd,
        pointing=pointing,
    )


def orders(seed: int, night: RandomNight) -> list[tuple[str, Order, float, Rules]]:
    """Return how each order of a night was made, the order, its factor of seeing and its rules."""
    random = np.random.default_rng([seed, 5])
    rules = decided(random, night)
    fresh = propose(problem_of(night, rules, 1.0, float(night.night.mjd[0]), None), steps=30)
    made = [("made afresh", fresh, 1.0, rules)]
    if not fresh.visits:
        return made
    factor = float(random.choice(SEEING_FACTORS))
    # Between visits: what was exposed of one under way would be counted in the plans.
    from_mjd = fresh.visits[int(random.integers(len(fresh.visits)))].start_mjd
    pointing = str(random.choice([target.name for target in night.night.targets]))
    later = problem_of(night, rules, factor, from_mjd, pointing)
    carried = propose(later, fresh, steps=15, afresh=bool(random.random() < 0.3))
    made.append(("carried on", carried, factor, rules))
    timed = retime(later, fresh)
    if timed is not None:
        made.append(("timed anew", timed, factor, rules))
    return made


def main() -> None:
    """Try the orders of many nights and count what is unlawful."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("nights", type=int, nargs="?", default=200, help="how many nights")
    nights = parser.parse_args().nights
    tried, exposures, found = Counter[str](), 0, 0
    for seed in range(FIRST_SEED, FIRST_SEED + nights):
        make = with_series if seed % 2 else random_night
        night = make(seed, SIZES[seed % len(SIZES)], LOADS[seed // 2 % len(LOADS)])
        for how, order, factor, rules in orders(seed, night):
            tried[how] += 1
            exposures += sum(run.count for visit in order.visits for run in visit.exposures)
            wrong = faults(order, night.night, night.outlook(factor), night.plans, rules)
            found += len(wrong)
            for fault in wrong:
                print(f"{seed} {how}: {fault}", flush=True)
    counts = ", ".join(f"{count} {how}" for how, count in tried.items())
    print(f"{nights} nights, {sum(tried.values())} orders ({counts})")
    print(
        f"{exposures} exposures looked at when they begin, at their middle and end: {found} faults"
    )


if __name__ == "__main__":
    main()
