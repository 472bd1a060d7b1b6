"""The search and its parts: exact tables, plain rules, steadiness, the proven limit's absence."""

from __future__ import annotations

import sys
from itertools import product

import numpy as np
import pytest

from engine.order import NoSolver, Order, Rules, propose, upper_limit
from engine.order.blocks import NEVER, cut
from engine.order.construct import URGENT, VALUE_FIRST, Start, Turn
from engine.order.improve import Effort, Search
from engine.order.prices import price_of_time
from engine.order.propose import plain_order
from engine.order.sequence import Sequence
from tests.bench.order.nights import RandomNight, random_night


@pytest.fixture(scope="module")
def night() -> RandomNight:
    """Return one night of sixteen targets that ask for twice its time."""
    return random_night(77, 16, 2.0)


def test_the_same_steps_and_seed_give_the_same_order(night: RandomNight) -> None:
    """Nothing of the search depends on the machine's speed when it is given steps."""
    orders = [propose(night.problem(), steps=40, seed=3) for _ in range(2)]
    assert orders[0].visits == orders[1].visits
    assert orders[0].value == orders[1].value


@pytest.mark.parametrize("seed", range(8))
def test_no_plain_rule_is_better(seed: int) -> None:
    """Best value first, with and without urgency, never beats what is proposed."""
    problem = random_night(seed, 15, (0.5, 1.0, 2.0, 4.0)[seed % 4]).problem()
    order = propose(problem, steps=20)
    for temper in (VALUE_FIRST, URGENT):
        assert plain_order(problem, temper).value() <= order.value + 1e-6


def test_searching_longer_is_not_worse_in_the_tables(night: RandomNight) -> None:
    """The best sequence met is kept."""
    problem = night.problem()
    blocks = cut(problem)
    start = Start(problem.pointing, 0)
    values = []
    for steps in (0, 50, 200):
        search = Search(blocks, problem.travel, start, Turn((), ()), seed=1)
        values.append(search.run(Effort(steps=steps)).value)
    assert values[0] == 0.0 < values[1] <= values[2]


def test_the_tables_find_the_best_moments(night: RandomNight) -> None:
    """Two blocks timed by the tables are worth what trying every pair of ticks finds."""
    problem = night.problem()
    blocks = cut(problem)
    start = Start(problem.pointing, 0)
    last = np.where(blocks.value > NEVER, np.arange(blocks.ticks + 1), -1).max(axis=1)
    pair = [int(np.argmin(last)), int(np.argmax(last))]
    sequence = Sequence(blocks, problem.travel, start, pair, {})
    again = Sequence(
        blocks, problem.travel, start, sequence.order, dict(zip(pair, sequence.ticks, strict=False))
    )
    assert again.order == pair
    lag = int(
        2.0 * blocks.minutes[pair[0]]
        + again.way(int(blocks.target[pair[0]]), pair[1], again.ticks[0])
        + 1.65
    )
    entry = round(again.way(problem.pointing, pair[0], 0)) + 1
    first, second = (np.flatnonzero(blocks.value[b] > NEVER) for b in pair)
    brute = max(
        float(blocks.value[pair[0], s] + blocks.value[pair[1], t])
        for s, t in product(first[first >= entry][::5], second[::5])
        if t >= s + lag
    )
    # Every fifth tick with a tick to spare: a little below the best, never above it.
    assert brute <= again.value + 1e-3
    assert again.value <= brute * 1.02


def test_an_order_in_force_is_carried_on(night: RandomNight) -> None:
    """A little change of the seeing doesn't reshuffle the next visits."""
    before = propose(night.problem(), steps=150)
    first = before.visits[0].exposures[0].start_mjd
    after = propose(night.problem(1.04, from_mjd=first - 5.0 / 1440.0), before, steps=20)
    assert [v.target for v in after.visits[:2]] == [v.target for v in before.visits[:2]]


def test_what_the_observer_wants_first_comes_first(night: RandomNight) -> None:
    """Any target that can be observed may be asked for next."""
    free = propose(night.problem(), steps=30)
    for wanted in {visit.target for visit in free.visits}:
        problem = night.problem(rules=Rules(first=wanted))
        taken = propose(problem, steps=10)
        assert wanted in {visit.target for visit in taken.visits}


def test_every_target_is_visited_or_left_out_with_a_reason(night: RandomNight) -> None:
    """Nothing is passed over in silence, and every visit says why now."""
    order = propose(night.problem(), steps=30)
    visited = {visit.target for visit in order.visits}
    left = {each.target for each in order.left_out}
    assert visited | left == {target.name for target in night.night.targets}
    assert not visited & left
    assert all(visit.reason for visit in order.visits)
    assert all(each.reason for each in order.left_out)


def test_a_night_without_anything_to_do_has_an_empty_order(night: RandomNight) -> None:
    """All dropped: no visit, no value, a limit of nothing."""
    rules = Rules(dropped=frozenset(target.name for target in night.night.targets))
    problem = night.problem(rules=rules)
    order: Order = propose(problem, steps=5)
    assert (order.visits, order.value, upper_limit(problem)) == ((), 0.0, 0.0)


def test_time_is_dear_only_where_it_is_wanted() -> None:
    """A list far too long makes every usable hour cost something; a short one leaves hours free."""
    prices = []
    for load in (0.3, 4.0):
        blocks = cut(random_night(5, 40, load).problem())
        prices.append(price_of_time(blocks, 0))
    assert prices[0].min() == 0.0
    values = cut(random_night(5, 40, 4.0).problem()).value[:, :-1]
    usable = np.asarray((values > NEVER).any(axis=0))
    assert np.median(prices[1][usable]) > np.median(prices[0][: len(usable)])


def test_the_mount_stays_for_nothing_and_turns_over_at_the_meridian() -> None:
    """A german mount pays for going on with its target only when that crosses the meridian."""
    seed = next(
        s
        for s in range(20)
        if random_night(s, 12, 1.0).night.observatory.telescope.mount == "german"
    )
    problem = random_night(seed, 12, 1.0).problem()
    travel = problem.travel
    for target in range(12):
        west = travel.west[target]
        crossing = np.flatnonzero((west[:-1] == 0) & (west[1:] == 1))
        assert travel.exact_min(target, 0.0, target, 0.0) == 0.0
        if crossing.size:
            at = float(crossing[0])
            assert travel.exact_min(target, at, target, at + 1.0) > 0.25


def test_the_limit_says_what_it_needs(night: RandomNight, monkeypatch: pytest.MonkeyPatch) -> None:
    """Without scipy the question is answered with what to install."""
    monkeypatch.setitem(sys.modules, "scipy.optimize", None)
    with pytest.raises(NoSolver, match="scipy"):
        upper_limit(night.problem())
