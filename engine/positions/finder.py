"""When does something change? One finder for everything that crosses zero.

A quantity is a function of time; an event is where it crosses zero. Rise, set, twilight, a limit
reached: all of them are this, so there is one finder and small functions to give it.
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


@dataclass(frozen=True, slots=True)
class Crossing:
    """A zero of a quantity: when (UTC MJD), and whether it was rising through zero."""

    mjd: float
    rising: bool


def crossings(
    quantity: Quantity, begin_mjd: float, end_mjd: float, step_days: float = 10.0 / 1440.0
) -> list[Crossing]:
    """Return the zeros of a quantity between two moments, in order of time.

    Bracketed on a grid of ``step_days``, then all halved together until half a second remains. A
    quantity that touches zero between two grid points without a change of sign there is not seen:
    the step bounds how short an event may be.
    """
    count = max(int(np.ceil((end_mjd - begin_mjd) / step_days)), 1)
    grid = np.linspace(begin_mjd, end_mjd, count + 1)
    above = quantity(grid) > 0.0
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
    quantity: Quantity, begin_mjd: float, end_mjd: float, step_days: float = 10.0 / 1440.0
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
