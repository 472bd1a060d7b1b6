"""The proven limit: above every order that can be made, and no further above than it must be."""

from __future__ import annotations

from dataclasses import replace
from itertools import permutations

import numpy as np
import pytest

from engine.order import Problem, propose, upper_limit
from engine.order.blocks import cut
from engine.order.construct import TEMPERS
from engine.order.filling import fill
from engine.order.propose import plain_order
from engine.order.sequence import Timed
from engine.order.timeline import Timeline
from tests.bench.order.nights import random_night, with_series

LOADS = (0.5, 1.0, 2.0, 4.0)


def best_of_all_turns(problem: Problem) -> float:
    """Return the greatest value of any turn of any of the blocks, timed exactly and filled."""
    blocks = cut(problem)
    rows = range(len(blocks.parts))
    best = 0.0
    for size in range(len(rows) + 1):
        for turn in permutations(rows, size):
            # As soon as can be, and each no sooner than where it is worth most by itself.
            best_ticks = np.argmax(blocks.value, axis=1)[list(turn)]
            for ticks in (np.zeros(size, dtype=int), best_ticks):
                timeline = Timeline(problem)
                timeline.place(blocks, Timed(turn, tuple(int(t) for t in ticks), 0.0))
                fill(timeline)
                best = max(best, timeline.value())
    return best


@pytest.mark.parametrize("seed", range(1, 5))
def test_no_turn_of_a_tiny_list_is_worth_more(seed: int) -> None:
    """Every subset of up to three blocks in every turn stays below the limit."""
    problem = random_night(seed, 3, LOADS[seed % 4]).problem()
    if len(cut(problem).parts) > 3:
        problem = random_night(seed, 2, 0.3).problem()
    best = best_of_all_turns(problem)
    assert best <= upper_limit(problem) + 1e-6
    assert best > 0.0


@pytest.mark.parametrize("first", range(0, 20, 10))
def test_no_order_is_worth_more(first: int) -> None:
    """Twenty small nights, each by the search and by one of its greedies alone."""
    for seed in range(first, first + 10):
        problem = random_night(7000 + seed, 1 + seed % 9, LOADS[seed % 4]).problem()
        limit = upper_limit(problem)
        assert propose(problem, steps=10, seed=seed).value <= limit + 1e-6
        assert plain_order(problem, TEMPERS[seed % len(TEMPERS)]).value() <= limit + 1e-6


@pytest.mark.parametrize("seed", range(4))
def test_no_order_with_repeat_visits_is_worth_more(seed: int) -> None:
    """Gaps, and standards over a spread of airmass, only lower what can be had."""
    problem = with_series(seed, 8, LOADS[seed % 4]).problem()
    assert propose(problem, steps=20).value <= upper_limit(problem) + 1e-6


@pytest.mark.parametrize("readout_s", [0.0, 40.0, 400.0])
def test_the_limit_holds_for_slow_cameras(readout_s: float) -> None:
    """The last frame is read out after the last minute of any use, and that takes its room."""
    for seed in range(2):
        night = random_night(seed, 5, LOADS[seed % 4])
        observatory = night.night.observatory
        camera = observatory.camera.model_copy(update={"readout_s": readout_s})
        slow = observatory.model_copy(update={"camera": camera})
        problem = replace(night, night=replace(night.night, observatory=slow)).problem()
        assert problem.readout_min == readout_s / 60.0
        assert propose(problem, steps=10).value <= upper_limit(problem) + 1e-6


@pytest.mark.parametrize("seed", range(4))
def test_every_stretch_gives_a_limit_and_finer_ones_are_closer(seed: int) -> None:
    """Any length of the stretches proves a limit; a minute's is below a quarter of an hour's."""
    problem = random_night(60 + seed, 12, LOADS[seed]).problem()
    value = propose(problem, steps=60).value
    limits = [upper_limit(problem, stretch_min) for stretch_min in (1, 5, 15)]
    assert all(value <= limit + 1e-6 for limit in limits)
    assert limits[0] < limits[2]


def test_nothing_comes_between_the_limit_and_stdout(capfd: pytest.CaptureFixture[str]) -> None:
    """What the solver prints stays off stdout, which may be read by a program."""
    upper_limit(random_night(3, 10, 4.0).problem())
    assert capfd.readouterr().out == ""
