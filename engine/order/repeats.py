"""Targets visited several times: the gaps between visits, and standards over a spread of airmass.

A visit of a series is taken whole or not at all. The next begins at least the least gap and at most
the greatest after the last one did; one that would come later than that is not worth anything.
Between visits of a standard the airmass should differ: the night's range of it is cut into as many
parts as visits are wanted, and the first visit in each counts in full, any other `SAMPLED_SHARE`.
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.logbook import Target
from engine.night import Series

Floats = NDArray[np.float64]

# What a standard is worth at an airmass that was sampled already: common practice, no source.
SAMPLED_SHARE = 0.5
# A visit has a minute to itself before the next of its series, or the two would be one.
APART_MIN = 1.0

# So many exposures of one line of the problem.
Part = tuple[int, int]


@dataclass(frozen=True, slots=True)
class Spread:
    """The range of airmass of a standard tonight, in parts (``edges``), and those sampled."""

    edges: tuple[float, ...]
    sampled: frozenset[int]

    def part(self, airmass: Floats) -> NDArray[np.int64]:
        """Return the part each airmass falls into."""
        return np.clip(np.searchsorted(self.edges, airmass, side="right") - 1, 0, self.parts - 1)

    @property
    def parts(self) -> int:
        """How many parts there are."""
        return len(self.edges) - 1

    @property
    def unsampled(self) -> tuple[int, ...]:
        """The parts in which no visit began yet."""
        return tuple(part for part in range(self.parts) if part not in self.sampled)


@dataclass(frozen=True, slots=True)
class Repeats:
    """What is left of one target's visits, in minutes of the problem.

    ``visits`` holds the parts of each. ``last_min`` is when the last one began, minus infinity for
    none; ``begun`` says that the first of ``visits`` is what remains of that one.
    """

    visits: tuple[tuple[Part, ...], ...]
    least_min: float
    greatest_min: float
    last_min: float
    begun: bool
    spread: Spread | None

    def may_begin(self, minute: float, last_min: float) -> bool:
        """Say whether a visit may begin at a minute when the last began at another."""
        gap_min = minute - last_min
        return last_min == -math.inf or self.least_min <= gap_min <= self.greatest_min


def repeats_of(
    series: Series,
    target: Target,
    lines: tuple[int | None, ...],
    each_min: tuple[float, ...],
    begins_min: float,
    airmass: Floats,
) -> Repeats:
    """Return a series as the search takes it.

    ``lines`` holds the problem's line of each line of the plan, None for one that is not to be
    exposed; ``each_min`` the minutes of one exposure of each. ``begins_min`` is when the last visit
    began, in minutes of the problem. ``airmass`` are those at which it may be exposed tonight.
    """
    visits = tuple(
        tuple(
            (line, count)
            for line, count in zip(lines, visit, strict=True)
            if line is not None and count
        )
        for visit in series.visits
    )
    whole_min = sum(
        line.count * minutes for line, minutes in zip(target.exposures, each_min, strict=True)
    )
    spread = None
    if target.role == "standard" and airmass.size:
        edges = tuple(np.linspace(airmass.min(), airmass.max(), target.visits + 1).tolist())
        spread = Spread(edges, frozenset())
        sampled = spread.part(np.array(series.airmasses)).tolist() if series.airmasses else []
        spread = Spread(edges, frozenset(sampled))
    return Repeats(
        visits=tuple(visit for visit in visits if visit),
        least_min=max(series.least_gap_min, whole_min + APART_MIN),
        greatest_min=series.greatest_gap_min,
        last_min=begins_min,
        begun=series.begun,
        spread=spread,
    )
