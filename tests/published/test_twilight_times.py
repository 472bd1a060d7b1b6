"""Rise, set, twilight and transit against tabulated times, rounded to the minute."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest
from astropy.coordinates import Angle
from numpy.typing import NDArray

from engine.logbook import Site
from engine.positions import Almanac, almanac, apparent_places, crossings, horizontal, moon, sun
from engine.times import mjd_from_iso, night_of
from tests.published.rows import Row, rows, told

Floats = NDArray[np.float64]

SECONDS_PER_DAY = 86400.0
# The Moon's semi-diameter runs from 14.7 to 16.8 arcmin; the row's altitude is that of its limb.
MOON_RADIUS_OVER_DISTANCE = 1737.4

SUN_EVENTS = {
    "civil dawn": "civil_dawn",
    "civil dusk": "civil_dusk",
    "sunrise": "sunrise",
    "sunset": "sunset",
    "astro_am": "astronomical_dawn",
    "naut_am": "nautical_dawn",
    "rise": "sunrise",
    "set": "sunset",
    "naut_pm": "nautical_dusk",
    "astro_pm": "astronomical_dusk",
}
SUN_PREFIXES = (
    "rise.usno.atl.civil_",
    "rise.usno.atl.sunrise",
    "rise.usno.atl07.",
    "rise.usno.fredonia.",
    "rise.afc.wayne",
    "twi.defiance.",
)
# Zones whose local noon lies near noon by the Sun, so that a night has both its ends.
TIMEZONES = {
    "Atlanta": "America/New_York",
    "Boston": "America/New_York",
    "Defiance OH": "America/New_York",
    "Fairbanks": "America/Anchorage",
    "Fredonia AZ": "America/Phoenix",
    "Philadelphia": "America/New_York",
    "Wayne NJ": "America/New_York",
}


def site_of(row: Row) -> Site:
    """Return the site of a row, at sea level as the tables take it."""
    inputs = row["inputs"]
    return Site(
        name=inputs["site"],
        latitude_deg=inputs["lat_deg"],
        longitude_deg=inputs["lon_east_deg"],
        elevation_m=0.0,
        timezone=TIMEZONES[inputs["site"]],
    )


def almanac_of(row: Row) -> Almanac:
    """Return our almanac of the night a row's moment falls in."""
    site = site_of(row)
    return almanac(site, night_of(mjd_from_iso(row["expected"]), site.timezone))


def off_s(row: Row, mjd: float | None) -> float:
    """Return how many seconds a found moment comes after the published one."""
    assert mjd is not None, f"found nothing: {row['id']}"
    return SECONDS_PER_DAY * (mjd - mjd_from_iso(row["expected"]))


@pytest.mark.parametrize("row", rows(*SUN_PREFIXES))
def test_sun(row: Row) -> None:
    value = off_s(row, getattr(almanac_of(row), SUN_EVENTS[row["inputs"]["event"]]))
    assert abs(value) <= row["tol_abs"], told(row, value)


def only_crossing(row: Row, quantity: Callable[[Floats], Floats], *, rising: bool) -> float | None:
    """Return the one crossing (UTC MJD) within three hours of a row's moment."""
    around = mjd_from_iso(row["expected"])
    found = [
        c.mjd for c in crossings(quantity, around - 0.125, around + 0.125) if c.rising is rising
    ]
    return found[0] if len(found) == 1 else None


@pytest.mark.parametrize("row", rows("rise.usno.atl.moonrise", "rise.bos.moon."))
def test_moon_by_its_limb(row: Row) -> None:
    """The tables take the upper limb at -34 arcmin: our finder on just that."""
    site = site_of(row)

    def limb_over_limit_deg(mjd: Floats) -> Floats:
        seen = moon(mjd, site)
        radius_deg = np.rad2deg(np.arcsin(MOON_RADIUS_OVER_DISTANCE / seen.distance_km))
        return np.asarray(seen.altitude_deg + radius_deg - row["inputs"]["altitude_deg"])

    rising = "rise" in row["inputs"]["event"]
    value = off_s(row, only_crossing(row, limb_over_limit_deg, rising=rising))
    assert abs(value) <= row["tol_abs"], told(row, value)


@pytest.mark.parametrize("row", rows("rise.usno.atl.moonrise", "rise.bos.moon."))
def test_moon_of_the_almanac(row: Row) -> None:
    """The almanac takes one radius for all distances: 1 arcmin, some seconds more."""
    found = almanac_of(row)
    value = off_s(row, found.moonrise if "rise" in row["inputs"]["event"] else found.moonset)
    assert abs(value) <= row["tol_abs"] + 10.0, told(row, value)


@pytest.mark.parametrize("row", rows("transit.fairbanks.moon"))
def test_transit_of_the_moon(row: Row) -> None:
    """Hour angle zero; the highest altitude comes ten minutes later."""
    site = site_of(row)
    transit_mjd = only_crossing(row, lambda mjd: moon(mjd, site).hour_angle_h, rising=True)
    value = off_s(row, transit_mjd)
    assert abs(value) <= row["tol_abs"], told(row, value)
    assert transit_mjd is not None
    altitude_deg = float(moon(transit_mjd, site).altitude_deg[0])
    assert altitude_deg == pytest.approx(row["inputs"]["altitude_deg"], abs=0.5)


@pytest.mark.parametrize("row", rows("transit.phil.rigel"))
def test_transit_of_a_star(row: Row) -> None:
    """Rigel, from its Hipparcos place (from memory)."""
    site = site_of(row)
    around = mjd_from_iso(row["expected"])
    rigel = apparent_places(Angle("5h14m32.27s").deg, Angle("-8d12m05.9s").deg, around)
    transit_mjd = only_crossing(
        row, lambda mjd: horizontal(rigel, mjd, site).hour_angle_h[0], rising=True
    )
    value = off_s(row, transit_mjd)
    assert abs(value) <= row["tol_abs"], told(row, value)
    assert transit_mjd is not None
    altitude_deg = float(horizontal(rigel, transit_mjd, site).altitude_deg[0, 0])
    assert altitude_deg == pytest.approx(row["inputs"]["altitude_deg"], abs=0.1)


def test_noon_in_the_zone_is_near_noon_by_the_sun() -> None:
    """What the table of zones above promises."""
    for row in [param.values[0] for param in rows(*SUN_PREFIXES)]:
        hours = sun(almanac_of(row).begin_mjd, site_of(row)).hour_angle_h
        assert abs(float(hours[0])) < 2.5
