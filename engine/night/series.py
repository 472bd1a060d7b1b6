"""Targets visited several times a night: which visits are left, and what binds the next."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Protocol

from engine.logbook import Target
from engine.night.progress import Progress


class TakenTonight(Protocol):
    """What matters here of an exposure that was taken this night and kept."""

    @property
    def target(self) -> str:
        """The target's name."""
        ...

    @property
    def start_mjd(self) -> float:
        """When it began (UTC MJD)."""
        ...

    @property
    def airmass_start(self) -> float | None:
        """The airmass when it began, if it is known."""
        ...


@dataclass(frozen=True, slots=True)
class Series:
    """The visits of one target that are still wanted.

    ``visits`` holds, for each, how many exposures of every line of the plan it takes; the first is
    what remains of one that was begun this night when ``begun``. The next begins at least
    ``least_gap_min`` and at most ``greatest_gap_min`` after the last did, ``last_start_mjd``
    (UTC MJD; None when none did tonight). ``airmasses`` are those at which visits began tonight.
    """

    visits: tuple[tuple[int, ...], ...]
    least_gap_min: float
    greatest_gap_min: float
    last_start_mjd: float | None = None
    begun: bool = False
    airmasses: tuple[float, ...] = ()


def series_of(
    target: Target, plan: tuple[Progress, ...], tonight: Iterable[TakenTonight]
) -> Series | None:
    """Return what is left of a target's visits; None for one that is visited once.

    ``plan`` is its plan with everything counted, ``tonight`` the night's exposures that are kept.
    """
    if target.visits == 1:
        return None
    each = [line.count for line in target.exposures]
    left = [line.remaining for line in plan]
    count = max(math.ceil(rest / per) for rest, per in zip(left, each, strict=True))
    visits = tuple(
        # Full ones last: what is missing of one that was begun comes first.
        tuple(
            min(per, max(rest - (count - 1 - place) * per, 0))
            for rest, per in zip(left, each, strict=True)
        )
        for place in range(count)
    )
    own = sorted((e for e in tonight if e.target == target.name), key=lambda e: e.start_mjd)
    begins = own[:: sum(each)]
    return Series(
        visits=visits,
        least_gap_min=target.least_gap_min or 0.0,
        greatest_gap_min=target.greatest_gap_min or math.inf,
        last_start_mjd=begins[-1].start_mjd if begins else None,
        begun=bool(begins and visits and visits[0] != tuple(each)),
        airmasses=tuple(e.airmass_start for e in begins if e.airmass_start is not None),
    )
