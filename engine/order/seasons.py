"""When a target that is out of reach tonight will be in reach: the coming year, to a day or two.

The sky stands the same way over the site at the same sidereal time all year; only the Sun moves
on. So one turn of the sky in steps of ten minutes, set against where the Sun is on each of the next
365 days, tells the first night with the target within its limits in the dark. Refraction, the
Moon and a target's own windows are left out; twenty minutes count as a night.
"""

from __future__ import annotations

from datetime import date, timedelta
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from engine.logbook import Observatory, Target
from engine.positions import airmass, skyline_altitude_deg, sun
from engine.times import night_span_mjd

Floats = NDArray[np.float64]
Mask = NDArray[np.bool_]

DAYS, STEPS, LEAST_STEPS = 365, 144, 2


@lru_cache(maxsize=1024)
def opens_on(observatory: Observatory, target: Target, after: date) -> date | None:
    """Return the next night (its evening's date) on which a target can be observed in the dark.

    None when there is none within a year.
    """
    filters = [observatory.filter_named(each.filter) for each in target.exposures]
    darkest_deg = min(each.maximum_sun_altitude_deg for each in filters)
    possible = _in_reach(observatory, target)[None] & _dark(observatory, after, darkest_deg)
    nights = np.flatnonzero(possible.sum(axis=1) >= LEAST_STEPS)
    return after + timedelta(days=int(nights[0]) + 1) if nights.size else None


def _turn_deg() -> Floats:
    return np.linspace(0.0, 360.0, STEPS, endpoint=False)


def _altitude_deg(hour_angle_deg: Floats, dec_deg: Floats, latitude_deg: float) -> Floats:
    """Return altitudes (deg) from hour angle and declination (deg), broadcast."""
    h, dec, lat = np.radians(hour_angle_deg), np.radians(dec_deg), np.radians(latitude_deg)
    sine = np.sin(lat) * np.sin(dec) + np.cos(lat) * np.cos(dec) * np.cos(h)
    return np.asarray(np.degrees(np.arcsin(np.clip(sine, -1.0, 1.0))))


def _in_reach(observatory: Observatory, target: Target) -> Mask:
    """Return at which sidereal times (S,) a target is within telescope's and its own limits."""
    site, telescope = observatory.site, observatory.telescope
    angle_deg = (_turn_deg() - target.ra_deg + 180.0) % 360.0 - 180.0
    altitude_deg = _altitude_deg(angle_deg, np.array(target.dec_deg), site.latitude_deg)
    h, dec = np.radians(angle_deg), np.radians(target.dec_deg)
    lat = np.radians(site.latitude_deg)
    north = np.sin(dec) * np.cos(lat) - np.cos(dec) * np.sin(lat) * np.cos(h)
    azimuth_deg = np.degrees(np.arctan2(-np.cos(dec) * np.sin(h), north)) % 360.0
    low_h, high_h = telescope.hour_angle_limits_h
    skyline_deg = skyline_altitude_deg(site.horizon, azimuth_deg)
    least_deg = np.maximum(skyline_deg, telescope.minimum_altitude_deg)
    found = (altitude_deg > 0.0) & (altitude_deg >= least_deg)
    found &= altitude_deg <= telescope.maximum_altitude_deg
    found &= (angle_deg >= 15.0 * low_h) & (angle_deg <= 15.0 * high_h)
    if target.maximum_airmass is not None:
        with np.errstate(invalid="ignore"):
            found &= airmass(altitude_deg, site.airmass_model) <= target.maximum_airmass
    return np.asarray(found)


@lru_cache(maxsize=16)
def _dark(observatory: Observatory, after: date, darkest_deg: float) -> Mask:
    """Return at which sidereal times the Sun is low enough, on each coming night (D, S)."""
    site = observatory.site
    begin_mjd, end_mjd = night_span_mjd(after, site.timezone)
    there = sun(0.5 * (begin_mjd + end_mjd) + np.arange(1, DAYS + 1), site)
    angle_deg = _turn_deg()[None] - there.ra_deg[:, None]
    altitude_deg = _altitude_deg(angle_deg, there.dec_deg[:, None], site.latitude_deg)
    return np.asarray(altitude_deg <= darkest_deg)
