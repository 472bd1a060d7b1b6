"""When does something change? One finder for everything that crosses zero.

A quantity is a function of time; an event is where it crosses zero. Rise, set, twilight, a limit
reached: all of them are this, so there is one finder and small functions to give it.

What only just happens is found too: a Sun that dips below the horizon for three minutes at
midsummer. Where the quantity turns between two points of the grid, the turn is looked at.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Quantity = Callable[[Floats], Floats]

# Half a second of time: finer than any rise or set can be known.
TOLERANCE_DAYS = 0.5 / 86400.0
STEP_DAYS = 10.0 / 1440.0


@dataclass(frozen=True, slots=True)
class Crossing:
    """A zero of a quantity: when (UTC MJD), and whether it was rising through zero."""

    mjd: float
    rising: bool


def sampled(
    quantity: Quantity, begin_mjd: float, end_mjd: float, step_days: float = STEP_DAYS
) -> tuple[Floats, Floats]:
    """Return rising moments (UTC MJD) and a quantity at them: a grid, and the turns in it.

    A turn is the vertex of the parabola through three neighbours, where it lies among them: also
    one before the first step is over, or in the last. An altitude on a grid of ten minutes is there
    within 0.01 arcsec of its extreme.
    """
    count = max(int(np.ceil((end_mjd - begin_mjd) / step_days)), 1)
    grid = np.linspace(begin_mjd, end_mjd, count + 1)
    values = quantity(grid)
    slopes = np.diff(values)
    before, after = slopes[:-1], slopes[1:]
    bend = before - after
    near = np.flatnonzero((bend != 0.0) & (np.abs(before + after) <= 2.0 * np.abs(bend)))
    if near.size == 0:
        return grid, values
    # In steps from the middle one of the three.
    vertex_steps = 0.5 * (before + after)[near] / bend[near]
    turns = grid[near + 1] + vertex_steps * (end_mjd - begin_mjd) / count
    moments = np.concatenate([grid, turns])
    order = np.argsort(moments)
    return moments[order], np.concatenate([values, quantity(turns)])[order]


def crossings(
    quantity: Quantity, begin_mjd: float, end_mjd: float, step_days: float = STEP_DAYS
) -> list[Crossing]:
    """Return the zeros of a quantity between two moments, in order of time.

    Bracketed on a grid of ``step_days`` and at the turns in it, then all halved together until half
    a second remains. A smooth quantity may cross and come back within a step; one with corners, or
    that turns twice within a step, is promised only what lasts longer than a step. A jump through
    zero counts as a crossing; NaN counts as not above.
    """
    grid, values = sampled(quantity, begin_mjd, end_mjd, step_days)
    above = values > 0.0
    places = np.flatnonzero(above[1:] != above[:-1])
    if places.size == 0:
        return []
    low, high, rising = grid[places], grid[places + 1], above[places + 1]
    while float(np.max(high - low)) > TOLERANCE_DAYS:
        middle = 0.5 * (low + high)
        passed = (quantity(middle) > 0.0) == rising
        low, high = np.where(passed, low, middle), np.where(passed, middle, high)
    return [
        Crossing(float(0.5 * (a + b)), bool(up)) for a, b, up in zip(low, high, rising, strict=True)
    ]


def spans_above(
    quantity: Quantity, begin_mjd: float, end_mjd: float, step_days: float = STEP_DAYS
) -> list[tuple[float, float]]:
    """Return the spans (begin, end) between two moments in which a quantity is positive."""
    found = crossings(quantity, begin_mjd, end_mjd, step_days)
    edges = [crossing.mjd for crossing in found]
    starts_above = (
        found[0].rising is False if found else bool(quantity(np.array([begin_mjd]))[0] > 0)
    )
    if starts_above:
        edges.insert(0, begin_mjd)
    if len(edges) % 2:
        edges.append(end_mjd)
    return list(zip(edges[::2], edges[1::2], strict=True))
