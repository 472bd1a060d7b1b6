"""The almanac of a night: Sun, twilight and Moon. Polar nights and white nights are ordinary."""

from __future__ import annotations

from dataclasses import dataclass
from datetime import date
from typing import TYPE_CHECKING

import numpy as np

from engine.positions.bodies import moon, sun
from engine.positions.finder import Crossing, Quantity, crossings, sampled, spans_above
from engine.times import night_span_mjd

if TYPE_CHECKING:
    from engine.logbook import Site

# The upper limb on a flat horizon: 34 arcmin of refraction and 16 of radius (common practice).
RISE_SET_ALTITUDE_DEG = -50.0 / 60.0
CIVIL_DEG, NAUTICAL_DEG, ASTRONOMICAL_DEG = -6.0, -12.0, -18.0
# The Moon's parallax moves it by a degree, its radius is near enough the Sun's: its topocentric
# altitude is held against the same limit.
SUN_STATES = ("rises and sets", "never rises", "never sets")


@dataclass(frozen=True, slots=True)
class Almanac:
    """The times of one night, UTC MJD; None for what does not happen in it.

    The night runs from local noon (``begin_mjd``) to local noon (``end_mjd``). Dusk is the last
    time the Sun sinks through an altitude before its lowest point, dawn the first time after.
    ``moonrise`` and ``moonset`` are the first of the night; only near the poles can there be more.
    ``moon_illumination`` (0 to 1) is at the middle of the night, when the Sun is lowest.
    """

    night: date
    begin_mjd: float
    end_mjd: float
    sunset: float | None
    civil_dusk: float | None
    nautical_dusk: float | None
    astronomical_dusk: float | None
    astronomical_dawn: float | None
    nautical_dawn: float | None
    civil_dawn: float | None
    sunrise: float | None
    moonrise: float | None
    moonset: float | None
    moon_illumination: float
    sun_state: str


def almanac(site: Site, night: date) -> Almanac:
    """Return the almanac of the night of a local date."""
    begin_mjd, end_mjd = night_span_mjd(night, site.timezone)
    lowest_mjd = _lowest_sun_mjd(site, begin_mjd, end_mjd)
    solar = {
        limit_deg: crossings(_sun_above(site, limit_deg), begin_mjd, end_mjd)
        for limit_deg in (RISE_SET_ALTITUDE_DEG, CIVIL_DEG, NAUTICAL_DEG, ASTRONOMICAL_DEG)
    }
    falls = {deg: _last(solar[deg], rising=False, before_mjd=lowest_mjd) for deg in solar}
    climbs = {deg: _first(solar[deg], rising=True, after_mjd=lowest_mjd) for deg in solar}
    lunar = crossings(
        lambda t: moon(t, site).altitude_deg - RISE_SET_ALTITUDE_DEG, begin_mjd, end_mjd
    )
    return Almanac(
        night=night,
        begin_mjd=begin_mjd,
        end_mjd=end_mjd,
        sunset=falls[RISE_SET_ALTITUDE_DEG],
        civil_dusk=falls[CIVIL_DEG],
        nautical_dusk=falls[NAUTICAL_DEG],
        astronomical_dusk=falls[ASTRONOMICAL_DEG],
        astronomical_dawn=climbs[ASTRONOMICAL_DEG],
        nautical_dawn=climbs[NAUTICAL_DEG],
        civil_dawn=climbs[CIVIL_DEG],
        sunrise=climbs[RISE_SET_ALTITUDE_DEG],
        moonrise=_first(lunar, rising=True, after_mjd=begin_mjd),
        moonset=_first(lunar, rising=False, after_mjd=begin_mjd),
        moon_illumination=float(moon(np.array([lowest_mjd]), site).illumination[0]),
        sun_state=_sun_state(site, solar[RISE_SET_ALTITUDE_DEG], lowest_mjd),
    )


def dark_spans(almanac_: Almanac, site: Site, limit_deg: float) -> list[tuple[float, float]]:
    """Return the spans (begin, end; UTC MJD) of a night with the Sun lower than a limit (deg)."""
    return spans_above(
        lambda t: limit_deg - sun(t, site).altitude_deg, almanac_.begin_mjd, almanac_.end_mjd
    )


def _sun_above(site: Site, limit_deg: float) -> Quantity:
    """Return the Sun's altitude over a limit (deg) as a quantity of time."""
    return lambda mjd: sun(mjd, site).altitude_deg - limit_deg


def _lowest_sun_mjd(site: Site, begin_mjd: float, end_mjd: float) -> float:
    moments, altitudes_deg = sampled(_sun_above(site, 0.0), begin_mjd, end_mjd)
    return float(moments[np.argmin(altitudes_deg)])


def _sun_state(site: Site, rises_and_sets: list[Crossing], lowest_mjd: float) -> str:
    if rises_and_sets:
        return SUN_STATES[0]
    lowest_deg = float(sun(lowest_mjd, site).altitude_deg[0])
    return SUN_STATES[2] if lowest_deg > RISE_SET_ALTITUDE_DEG else SUN_STATES[1]


def _last(found: list[Crossing], *, rising: bool, before_mjd: float) -> float | None:
    times = [each.mjd for each in found if each.rising is rising and each.mjd <= before_mjd]
    return times[-1] if times else None


def _first(found: list[Crossing], *, rising: bool, after_mjd: float) -> float | None:
    times = [each.mjd for each in found if each.rising is rising and each.mjd >= after_mjd]
    return times[0] if times else None
