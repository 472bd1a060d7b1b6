"""The night's tables: where every target is at every minute, and which limits it breaks.

Built once a night (and again when the list is edited); nothing in here depends on the seeing.
What does is in `engine.night.outlook`.

Shapes: N targets, T moments, F filters.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from datetime import date

import numpy as np
from numpy.typing import NDArray

from engine.light import MoonLight, sky_mags_arcsec2
from engine.logbook import Logbook, Observatory, Target
from engine.night.limits import limit_bits
from engine.positions import (
    Air,
    Almanac,
    Body,
    Horizontal,
    Moon,
    Places,
    airmass,
    almanac,
    apparent_altitude_deg,
    apparent_places,
    horizontal,
    moon,
    separation_deg,
    sun,
)
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]

# Before sunset and after sunrise: flats, focus and the first pointing happen there.
MARGIN_MIN = 30.0


@dataclass(frozen=True, slots=True)
class Night:
    """Everything about a night that does not depend on its seeing.

    Angles as their names say; ``mjd`` (T,) is UTC. ``airmass`` is NaN below the horizon.
    ``limits`` holds, for each target and moment, the bits of the reasons that forbid it.
    ``dark`` (F, T) says when the Sun is low enough for each filter.
    """

    observatory: Observatory
    targets: tuple[Target, ...]
    almanac: Almanac
    air: Air
    mjd: Floats
    places: Places
    where: Horizontal
    apparent_altitude_deg: Floats
    airmass: Floats
    moon_separation_deg: Floats
    sun_separation_deg: Floats
    sun: Body
    moon: Moon
    dark: NDArray[np.bool_]
    sky_mag_arcsec2: NDArray[np.float32]
    limits: NDArray[np.uint32]

    def index_at(self, mjd: float) -> int:
        """Return the place in the grid nearest to a moment, held to the grid's ends."""
        place = int(np.searchsorted(self.mjd, mjd - 0.5 / MINUTES_PER_DAY))
        return min(place, self.last)

    @property
    def last(self) -> int:
        """The last place in the grid."""
        return len(self.mjd) - 1

    def target_index(self, name: str) -> int:
        """Return the place of a target in the list; KeyError when it is not there."""
        for index, target in enumerate(self.targets):
            if target.name == name:
                return index
        raise KeyError(name)


def open_night(logbook: Logbook, night: date, air: Air | None = None) -> Night:
    """Return the tables of a night, minute by minute.

    From half an hour before sunset to half an hour after sunrise; from noon to noon when the Sun
    does not cross the horizon.
    """
    times = almanac(logbook.observatory.site, night)
    margin = MARGIN_MIN / MINUTES_PER_DAY
    begin = times.begin_mjd if times.sunset is None else times.sunset - margin
    end = times.end_mjd if times.sunrise is None else times.sunrise + margin
    if end <= begin:
        begin, end = times.begin_mjd, times.end_mjd
    first = math.floor(begin * MINUTES_PER_DAY)
    minutes = np.arange(first, math.ceil(end * MINUTES_PER_DAY) + 1)
    return tables(logbook.observatory, logbook.targets, times, minutes / MINUTES_PER_DAY, air)


def tables(
    observatory: Observatory,
    targets: tuple[Target, ...],
    times: Almanac,
    mjd: Floats,
    air: Air | None = None,
) -> Night:
    """Return the tables for chosen targets at chosen moments (T,) of one night."""
    site = observatory.site
    air = air or Air.standard(site.elevation_m)
    middle = 0.5 * (float(mjd[0]) + float(mjd[-1]))
    places = apparent_places(
        np.array([target.ra_deg for target in targets], dtype=float),
        np.array([target.dec_deg for target in targets], dtype=float),
        middle,
        pm_ra_mas_per_yr=np.array([target.pm_ra_mas_per_yr for target in targets], dtype=float),
        pm_dec_mas_per_yr=np.array([target.pm_dec_mas_per_yr for target in targets], dtype=float),
        epoch_yr=np.array([target.epoch_yr for target in targets], dtype=float),
    )
    where = horizontal(places, mjd, site)
    the_sun, the_moon = sun(mjd, site), moon(mjd, site)
    seen_deg = apparent_altitude_deg(where.altitude_deg, air)
    from_sun_deg, from_moon_deg = (
        separation_deg(
            places.ra_deg[:, None], places.dec_deg[:, None], body.ra_deg[None], body.dec_deg[None]
        )
        for body in (the_sun, the_moon)
    )
    night = Night(
        observatory=observatory,
        targets=targets,
        almanac=times,
        air=air,
        mjd=mjd,
        places=places,
        where=where,
        apparent_altitude_deg=seen_deg,
        airmass=airmass(seen_deg, site.airmass_model, air),
        moon_separation_deg=from_moon_deg,
        sun_separation_deg=from_sun_deg,
        sun=the_sun,
        moon=the_moon,
        dark=np.array(
            [the_sun.altitude_deg <= each.maximum_sun_altitude_deg for each in observatory.filters]
        ),
        sky_mag_arcsec2=np.empty((0, 0, 0), dtype=np.float32),
        limits=np.zeros((0, 0), dtype=np.uint32),
    )
    return replace(night, sky_mag_arcsec2=_sky(night), limits=limit_bits(night))


def _sky(night: Night) -> NDArray[np.float32]:
    moonlight = MoonLight(
        altitude_deg=night.moon.altitude_deg,
        separation_deg=night.moon_separation_deg,
        phase_angle_deg=night.moon.phase_angle_deg,
    )
    return sky_mags_arcsec2(
        night.observatory.filters,
        altitude_deg=night.where.altitude_deg,
        sun_altitude_deg=night.sun.altitude_deg,
        moon=moonlight,
        pressure_hpa=night.air.pressure_hpa,
        precision=np.float32,
    )
