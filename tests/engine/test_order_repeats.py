"""Visits of a series keep their gaps, whatever else is in the night; standards are spread."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
import pytest

from engine.logbook import Target
from engine.night import plans, series_of
from engine.order import Order, Rules, build_problem, propose, retime
from engine.times import MINUTES_PER_DAY
from tests.bench.order.nights import RandomNight, random_night, with_series
from tests.engine.lawful import faults
from tests.engine.test_night_tables import Took


@dataclass(frozen=True)
class Taken(Took):
    """An exposure with its moment."""

    start_mjd: float = 0.0
    airmass_start: float | None = None


def visits_of(order: Order, night: RandomNight) -> int:
    """Return how many visits of series an order has."""
    series = {target.name for target in night.night.targets if target.visits > 1}
    return sum(visit.target in series for visit in order.visits)


@pytest.mark.parametrize("seed", range(24))
def test_visits_keep_their_gaps(seed: int) -> None:
    """Cold, carried on, and timed anew, by the checker that shares no code with the search."""
    night = with_series(seed, (8, 15, 40)[seed % 3], (0.5, 1.0, 2.0, 4.0)[seed % 4])
    problem = night.problem()
    order = propose(problem, steps=40)
    assert faults(order, night.night, night.outlook(), night.plans, Rules()) == []
    again = propose(problem, order, steps=20)
    assert faults(again, night.night, night.outlook(), night.plans, Rules()) == []
    timed = retime(problem, order)
    if timed is not None:
        assert faults(timed, night.night, night.outlook(), night.plans, Rules()) == []


def test_series_are_not_starved() -> None:
    """Over many nights a good part of the visits that are wanted is there."""
    placed = wanted = 0
    for seed in range(12):
        night = with_series(seed, 12, 0.5)
        placed += visits_of(propose(night.problem(), steps=40), night)
        wanted += sum(target.visits for target in night.night.targets if target.visits > 1)
    assert placed > 0.6 * wanted


def test_a_visit_that_was_made_binds_the_next() -> None:
    """From its begin on, not sooner than the least gap and not later than the greatest."""
    night = with_series(3, 15, 1.0, share=1.0)
    order = propose(night.problem(), steps=40)
    first = next(
        visit
        for visit in order.visits
        if sum(other.target == visit.target for other in order.visits) > 1
    )
    target = night.night.targets[night.night.target_index(first.target)]
    tonight = [
        Taken(
            target.name,
            run.filter,
            run.seconds,
            start_mjd=run.start_mjd + place * run.seconds / 86400.0,
        )
        for run in first.exposures
        for place in range(run.count)
    ]
    progress = plans(night.night.targets, tonight)
    problem = build_problem(
        night.night,
        night.outlook(),
        progress,
        Rules(),
        from_mjd=first.end_mjd,
        pointing=target.name,
        tonight=tonight,
    )
    after = propose(problem, steps=40)
    begins = [v.exposures[0].start_mjd for v in after.visits if v.target == target.name]
    assert begins
    gap_min = (begins[0] - tonight[0].start_mjd) * MINUTES_PER_DAY
    assert gap_min >= (target.least_gap_min or 0.0) - 0.02
    assert gap_min <= (target.greatest_gap_min or np.inf) + 0.02


def test_what_is_left_of_a_visit_comes_first() -> None:
    """Two of three visits of two exposures: after three exposures one is left of the second."""
    target = Target.model_validate(
        {
            "name": "A",
            "ra": 10.0,
            "dec": -20.0,
            "exposures": [
                {"filter": "B", "seconds": 30.0, "count": 1},
                {"filter": "V", "seconds": 30.0, "count": 1},
            ],
            "visits": 3,
            "least_gap_min": 20.0,
        }
    )
    tonight = [
        Taken("A", name, 30.0, start_mjd=61000.0 + place / 1440.0)
        for place, name in enumerate(("B", "V", "B"))
    ]
    series = series_of(target, plans([target], tonight)["A"], tonight)
    assert series is not None
    assert series.visits == ((0, 1), (1, 1))
    assert series.begun
    assert series.last_start_mjd == pytest.approx(61000.0 + 2 / 1440.0)


def test_what_is_wanted_each_night_forgets_earlier_ones() -> None:
    """A standard that was taken last week is wanted again."""
    plain = {
        "name": "A",
        "ra": 10.0,
        "dec": -20.0,
        "exposures": [{"filter": "B", "seconds": 30.0, "count": 2}],
    }
    earlier = [Took("A", "B", 30.0)] * 2
    once, anew = (
        plans([Target.model_validate(plain | {"each_night": flag})], (), earlier)["A"][0]
        for flag in (False, True)
    )
    assert (once.remaining, anew.remaining) == (0, 2)


def test_standards_are_sampled_over_the_airmass() -> None:
    """With room enough, visits of a standard lie in different parts of its range."""
    sampled = []
    for seed in range(6):
        night = random_night(seed, 8, 0.3)
        may = (night.night.limits == 0) & night.night.dark.all(axis=0)
        index = int(may.sum(axis=1).argmax())
        reached = night.night.airmass[index, may[index]]
        edges = np.linspace(float(reached.min()), float(reached.max()), 5)
        parts = []
        for role in ("science", "standard"):
            order = propose(with_visits(night, index, role).problem(), steps=60)
            name = night.night.targets[index].name
            masses = np.array([v.airmass_start for v in order.visits if v.target == name])
            parts.append(len(set(np.searchsorted(edges, masses, side="right"))))
        sampled.append(parts)
    science, standard = np.array(sampled).T
    assert standard.mean() >= 3.0, sampled
    assert standard.mean() > science.mean() + 1.0, sampled


def with_visits(night: RandomNight, index: int, role: str) -> RandomNight:
    """Return a night in which one target wants four short visits."""
    target = night.night.targets[index]
    short = target.exposures[0].model_copy(update={"seconds": 60.0, "count": 3})
    changed = target.model_copy(
        update={
            "visits": 4,
            "least_gap_min": 20.0,
            "contiguous_min": None,
            "role": role,
            "exposures": (short,),
        }
    )
    targets = (*night.night.targets[:index], changed, *night.night.targets[index + 1 :])
    return replace(night, night=replace(night.night, targets=targets), plans=plans(targets, ()))
