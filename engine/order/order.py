"""What an order is: visits in turn, what is left out, and the observer's own rules."""

from __future__ import annotations

from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True)
class PlacedExposures:
    """So many exposures in one filter, one after the other, from a moment on (UTC MJD)."""

    filter: str
    seconds: float
    count: int
    start_mjd: float


@dataclass(frozen=True, slots=True)
class Visit:
    """One stay on one target: when (UTC MJD, the slew included), what, and why now.

    ``image_size_arcsec`` is the largest predicted in it.
    """

    target: str
    start_mjd: float
    end_mjd: float
    exposures: tuple[PlacedExposures, ...]
    airmass_start: float
    airmass_end: float
    image_size_arcsec: float
    reason: str = ""


@dataclass(frozen=True, slots=True)
class LeftOut:
    """A target with something left to do that is not in the order, and why."""

    target: str
    reason: str


@dataclass(frozen=True, slots=True)
class Order:
    """What to point at from one moment to another (UTC MJD), and what that is worth.

    ``value`` is by the documented merit; ``bound``, when it was asked for, is a proven upper limit
    to the value of any order.
    """

    from_mjd: float
    until_mjd: float
    value: float
    visits: tuple[Visit, ...]
    left_out: tuple[LeftOut, ...]
    compute_ms: float
    bound: float | None = None

    @property
    def next(self) -> Visit | None:
        """The first visit; None when there is none."""
        return self.visits[0] if self.visits else None


@dataclass(frozen=True, slots=True)
class Rules:
    """What the observer has decided, which every order works around.

    ``put_off`` holds, by target, the moment (UTC MJD) before which it is not wanted; ``first`` a
    target to take next whatever else, all of it if ``hold``; ``pinned``, by target, the moment (UTC
    MJD) at which its exposures should begin.
    """

    dropped: frozenset[str] = frozenset()
    put_off: dict[str, float] = field(default_factory=dict)
    forbidden_filters: frozenset[str] = frozenset()
    first: str | None = None
    hold: bool = False
    pinned: dict[str, float] = field(default_factory=dict)
