"""What the observer pins to a moment or holds is where she wants it; the rest stays lawful."""

from __future__ import annotations

import numpy as np
import pytest

from engine.order import Order, Rules, propose
from engine.times import MINUTES_PER_DAY
from tests.bench.order.nights import RandomNight, random_night
from tests.engine.lawful import faults

SECOND_DAYS = 1.0 / 86400.0


def ordered(night: RandomNight, rules: Rules, before: Order | None = None) -> Order:
    """Return the order of a night under some rules."""
    problem = night.problem(rules=rules)
    return propose(problem, before, steps=40)


def a_moment_for(night: RandomNight, seed: int) -> tuple[str, float]:
    """Return a target and a moment at which ten minutes of it may begin, an hour into the dark."""
    random = np.random.default_rng(seed)
    free = ordered(night, Rules())
    name = str(random.choice([visit.target for visit in free.visits]))
    index = night.night.target_index(name)
    outlook = night.outlook()
    needed = [night.night.observatory.filter_index(line.filter) for line in night.plans[name]]
    open_ = (
        (night.night.limits[index] == 0)
        & night.night.dark[needed].all(axis=0)
        & ~outlook.soft[needed, index].any(axis=0)
    )
    lasts = np.lib.stride_tricks.sliding_window_view(open_, 12).all(axis=1)
    dark = int(np.argmax(night.night.dark.all(axis=0)))
    possible = [at for at in np.flatnonzero(lasts) if at > dark + 60]
    if not possible:
        pytest.skip("no target of this night lasts")
    return name, float(night.night.mjd[int(random.choice(possible))]) + 11.0 * SECOND_DAYS


@pytest.mark.parametrize("seed", range(16))
def test_a_pinned_target_begins_at_its_moment_to_the_second(seed: int) -> None:
    night = random_night(seed, (8, 15, 40)[seed % 3], (0.5, 1.0, 2.0, 4.0)[seed % 4])
    name, at_mjd = a_moment_for(night, seed)
    before = ordered(night, Rules())
    rules = Rules(pinned={name: at_mjd})
    for order in (ordered(night, rules), ordered(night, rules, before)):
        assert faults(order, night.night, night.outlook(), night.plans, rules) == []
        begins = [v.exposures[0].start_mjd for v in order.visits if v.target == name]
        assert begins, order.left_out
        crosses = abs(begins[0] - at_mjd) > 0.5 / MINUTES_PER_DAY
        # A german mount may have to turn over first; nothing else may make it late.
        assert not crosses or _near_meridian(night, name, at_mjd)
        assert "pinned to" in next(v.reason for v in order.visits if v.target == name)
        # The others still use the night: it is not left empty for the pin's sake.
        assert order.value > 0.6 * before.value


def _near_meridian(night: RandomNight, name: str, at_mjd: float) -> bool:
    if night.night.observatory.telescope.mount != "german":
        return False
    at, index = night.night.index_at(at_mjd), night.night.target_index(name)
    return bool(abs(night.night.where.hour_angle_h[index, at : at + 45]).min() < 0.05)


def test_a_pin_that_cannot_be_kept_is_told() -> None:
    night = random_night(77, 16, 2.0)
    name = ordered(night, Rules()).visits[-1].target
    dusk = float(night.night.mjd[0])
    closed = night.night.limits[night.night.target_index(name)] != 0
    assert closed[:40].any()
    rules = Rules(pinned={name: dusk})
    order = ordered(night, rules)
    assert faults(order, night.night, night.outlook(), night.plans, rules) == []
    said = [v.reason for v in order.visits if v.target == name]
    said += [each.reason for each in order.left_out if each.target == name]
    assert any("pinned to" in each for each in said)


@pytest.mark.parametrize("seed", range(6))
def test_all_of_what_is_held_comes_first(seed: int) -> None:
    night = random_night(seed, 15, 1.0)
    free = ordered(night, Rules())
    name = free.visits[0].target
    rules = Rules(first=name, hold=True)
    order = ordered(night, rules)
    assert faults(order, night.night, night.outlook(), night.plans, rules) == []
    places = [place for place, visit in enumerate(order.visits) if visit.target == name]
    assert places[0] == 0
    # In one go, but for a turn of the mount or a limit that comes between.
    held = [visit for visit in order.visits[: places[-1] + 1] if visit.target != name]
    planned = sum(line.planned for line in night.plans[name])
    first = sum(
        run.count for v in order.visits[: len(places)] if v.target == name for run in v.exposures
    )
    assert not held or first < planned
