"""Orders of random nights, judged by a checker that shares no code with the search."""

from __future__ import annotations

from dataclasses import replace

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from engine.order import Rules, Visit, propose, upper_limit
from tests.bench.order.nights import RandomNight, random_night
from tests.engine.lawful import faults

LOADS = (0.5, 1.0, 2.0, 4.0)


@settings(max_examples=8, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(seed=st.integers(0, 10_000), targets=st.integers(1, 30), load=st.sampled_from(LOADS))
def test_orders_are_lawful_and_below_the_proven_limit(seed: int, targets: int, load: float) -> None:
    """No limit, overlap or count is broken on any night, and no order beats the limit."""
    night = random_night(seed, targets, load)
    problem = night.problem()
    order = propose(problem, steps=30)
    assert faults(order, night.night, night.outlook(), night.plans, Rules()) == []
    assert order.value <= upper_limit(problem) + 1e-6


@pytest.fixture(scope="module")
def night() -> RandomNight:
    """Return one night of twelve targets that ask for all of it."""
    return random_night(41, 12, 1.0)


def test_the_rules_of_the_observer_hold(night: RandomNight) -> None:
    """What is dropped, put off or put aside stays out; the checker looks for it."""
    free = propose(night.problem(), steps=30)
    dropped, put_off = free.visits[0].target, free.visits[1].target
    filter_ = free.visits[2].exposures[0].filter
    until = free.visits[1].end_mjd + 0.05
    rules = Rules(frozenset({dropped}), {put_off: until}, frozenset({filter_}))
    assert faults(free, night.night, night.outlook(), night.plans, rules) != []
    problem = night.problem(rules=rules)
    order = propose(problem, steps=30)
    assert order.visits
    assert faults(order, night.night, night.outlook(), night.plans, rules) == []


def test_the_checker_finds_what_is_wrong(night: RandomNight) -> None:
    """Shift a visit, take too many, point at what is down: each is found."""
    order = propose(night.problem(), steps=30)
    first, second, *rest = order.visits

    def wrong(*visits: Visit) -> list[str]:
        changed = replace(order, visits=visits)
        return faults(changed, night.night, night.outlook(), night.plans, Rules())

    def moved(by_days: float) -> Visit:
        runs = tuple(replace(r, start_mjd=r.start_mjd + by_days) for r in second.exposures)
        return replace(second, start_mjd=second.start_mjd + by_days, exposures=runs)

    early = first.end_mjd - second.exposures[0].start_mjd
    assert any("too early" in each for each in wrong(first, moved(early), *rest))
    many = tuple(replace(r, count=r.count + 1) for r in first.exposures)
    assert any("asked for" in each for each in wrong(replace(first, exposures=many), second))
    assert any("too light" in each for each in wrong(first, moved(0.5)))


@pytest.mark.parametrize("seed", range(4))
def test_an_order_carried_on_is_lawful(seed: int) -> None:
    """Two hours later and under another seeing, what is kept of an order breaks nothing."""
    night = random_night(300 + seed, 15, LOADS[seed])
    before = propose(night.problem(), steps=20)
    from_mjd = before.visits[0].exposures[0].start_mjd + 2.013 / 24.0
    problem = night.problem(1.08, from_mjd)
    after = propose(problem, before, steps=10)
    assert after.visits
    assert faults(after, night.night, night.outlook(1.08), night.plans, Rules()) == []
