"""What is said of targets left out is true: what they lack, when they open, where they fit."""

from __future__ import annotations

import re
from dataclasses import replace
from datetime import date, timedelta
from pathlib import Path

import numpy as np
import pytest

from engine.logbook import Logbook, Target
from engine.night import open_night
from engine.order import Order, PlacedExposures, Problem, Rules, Visit, build_problem, propose
from engine.order.local import local_time
from engine.order.seasons import opens_on
from engine.times import MINUTES_PER_DAY
from tests.bench.order.nights import RandomNight, random_night
from tests.engine.lawful import faults

FITS = re.compile(r"would fit at (\d\d:\d\d) in place of (.*?)(?:, worth|, though|$)")


def ordered(night: RandomNight, rules: Rules) -> Order:
    """Return the order of a whole night under some rules."""
    begin_mjd = float(night.night.mjd[0])
    problem = build_problem(
        night.night, night.outlook(), night.plans, rules, from_mjd=begin_mjd, pointing=None
    )
    return propose(problem, steps=60)


def why(order: Order, name: str) -> str:
    """Return why a target is left out."""
    return next(each.reason for each in order.left_out if each.target == name)


def visit_after(problem: Problem, before: Visit | None, name: str) -> Visit:
    """Return a visit with all of a target's plan, as soon as the one before allows."""
    index = problem.night.target_index(name)
    leave = problem.from_mjd if before is None else before.end_mjd
    leave_min = (leave - problem.mjd_at(0.0)) * MINUTES_PER_DAY
    here = problem.pointing if before is None else problem.night.target_index(before.target)
    at = leave_min + problem.travel.exact_min(here, leave_min, index, leave_min) + 0.05
    runs = []
    for line in (problem.lines[place] for place in problem.lines_of(index)):
        filter_ = problem.night.observatory.filters[line.filter].name
        at += line.change_min
        runs.append(PlacedExposures(filter_, line.seconds, line.count, problem.mjd_at(at)))
        at += line.count * line.each_min
    return Visit(name, leave, problem.mjd_at(at), tuple(runs), 1.0, 1.0, 1.0)


@pytest.mark.parametrize("seed", range(3002, 3006))
def test_what_would_fit_in_place_of_others_does(seed: int) -> None:
    """Put there, the whole order is lawful; the checker shares no code with the sentence."""
    night = random_night(seed, 20, 2.0)
    problem = night.problem()
    order = propose(problem, steps=60)
    tried = 0
    for each in order.left_out:
        said = FITS.search(each.reason)
        if said is None or problem.asked_min(problem.night.target_index(each.target)) > 60.0:
            continue
        names = set(re.findall(r"F\d\d\d", said[2]))
        gone = [place for place, visit in enumerate(order.visits) if visit.target in names]
        first = next(
            place for place in gone if local_time(problem, _left(problem, order, place)) == said[1]
        )
        last = first + len(names) - 1
        before = order.visits[first - 1] if first else None
        there = visit_after(problem, before, each.target)
        visits = (*order.visits[:first], there, *order.visits[last + 1 :])
        changed = replace(order, visits=visits)
        found = faults(changed, night.night, night.outlook(), night.plans, Rules())
        # What is left of a target that loses one of its visits is not in question.
        assert [fault for fault in found if fault.split(":")[0] not in names] == [], each
        tried += 1
    assert tried or not any("would fit" in each.reason for each in order.left_out)


def _left(problem: Problem, order: Order, place: int) -> float:
    return order.visits[place - 1].end_mjd if place else problem.from_mjd


def test_the_seeing_that_is_named_is_what_it_takes() -> None:
    """A little under it, images are within the limit somewhere; a fifth above it, nowhere."""
    tried = 0
    for seed in range(3000, 3040):
        night = random_night(seed, 12, 1.0)
        for each in propose(night.problem(), steps=5).left_out:
            said = re.search(r"needs seeing under ([\d.]+) arcsec", each.reason)
            if said is None:
                continue
            tried += 1
            index = night.night.target_index(each.target)
            filters = [
                night.night.observatory.filter_index(e.filter) for e in night.plans[each.target]
            ]
            free = (night.night.limits[index] == 0)[None] & night.night.dark[filters]
            for factor, wanted in ((0.97, True), (1.2, False)):
                seeing = np.full(len(night.night.mjd), float(said[1]) * factor)
                soft = night.outlooks.given(seeing).soft[filters, index]
                assert (~soft & free).any() == wanted, (each, factor)
        if tried >= 3:
            break
    assert tried


@pytest.mark.parametrize("seed", range(5))
def test_a_target_opens_when_it_is_said_to(seed: int) -> None:
    """The night's own tables agree: in reach on that date, not yet three days before."""
    night = random_night(4000 + seed, 3, 1.0).night
    random = np.random.default_rng(seed)
    target = Target.model_validate(
        {
            "name": "elsewhere",
            "ra": float(random.uniform(0.0, 360.0)),
            "dec": float(
                np.clip(night.observatory.site.latitude_deg + random.uniform(-60, 60), -80, 80)
            ),
            "maximum_airmass": 1.8,
            "exposures": [{"filter": "V", "seconds": 60.0, "count": 5}],
        }
    )
    tonight = night.almanac.night
    opens = opens_on(night.observatory, target, tonight)

    def minutes(day: date) -> int:
        logbook = Logbook(Path("/nowhere"), night.observatory, (), (target,))
        tables = open_night(logbook, day)
        filter_ = night.observatory.filter_index("V")
        return int(((tables.limits[0] == 0) & tables.dark[filter_]).sum())

    if opens is None:
        assert all(minutes(tonight + timedelta(days=days)) < 30 for days in range(1, 366, 30))
        return
    assert minutes(opens + timedelta(days=1)) >= 5
    if (opens - tonight).days > 4:
        assert minutes(opens - timedelta(days=3)) < 30


def test_what_the_observer_decided_is_told() -> None:
    """Dropped, put aside, put off for too long: each with what would bring it back."""
    night = random_night(77, 16, 2.0)
    free = ordered(night, Rules())
    name = free.visits[0].target
    assert "release it" in why(ordered(night, Rules(dropped=frozenset({name}))), name)
    every = frozenset(each.filter for each in night.plans[name])
    assert "put aside" in why(ordered(night, Rules(forbidden_filters=every)), name)
    late = ordered(night, Rules(put_off={name: float(night.night.mjd[-1])}))
    assert why(late, name).startswith("put off until")
    gone = ordered(
        night, Rules(pinned={name: float(night.night.mjd[0]) - 0.3}, dropped=frozenset({name}))
    )
    assert why(gone, name).startswith("pinned to")
