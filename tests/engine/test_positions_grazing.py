"""Nights on which the Sun only just does something: minutes of darkness, minutes of day.

The latitude is chosen so that the Sun's lowest (or highest) altitude passes the limit by a hair;
what must be found is known from its altitude every four seconds.
"""

from __future__ import annotations

from datetime import date

import numpy as np
import pytest
from numpy.typing import NDArray

from engine.logbook import Site
from engine.positions import almanac, crossings, dark_spans, sun
from engine.positions.almanac import RISE_SET_ALTITUDE_DEG
from engine.positions.finder import Quantity, sampled
from engine.times import night_span_mjd

Floats = NDArray[np.float64]

MIDSUMMER, MIDWINTER = date(2026, 6, 21), date(2026, 12, 21)
SECONDS_PER_DAY = 86400.0
# The grid of these tests and the finder's half second.
APART_S = 4.5
LIMITS = {
    "sunset": ("sunset", "sunrise", RISE_SET_ALTITUDE_DEG),
    "civil": ("civil_dusk", "civil_dawn", -6.0),
    "nautical": ("nautical_dusk", "nautical_dawn", -12.0),
    "astronomical": ("astronomical_dusk", "astronomical_dawn", -18.0),
}
# Solar midnight at different places between two points of the finder's grid.
LONGITUDES_DEG = (-0.9, 0.0, 1.3)


def site_at(latitude_deg: float, longitude_deg: float) -> Site:
    """Return an invented site near the meridian of Greenwich."""
    return Site(
        name="Invented",
        latitude_deg=latitude_deg,
        longitude_deg=longitude_deg,
        elevation_m=0.0,
        timezone="UTC",
    )


def minutes_around(noon_mjd: float, longitude_deg: float) -> Floats:
    """Return moments (UTC MJD), 4 s apart, of 20 minutes around a noon or midnight by the Sun.

    ``noon_mjd`` is that of Greenwich; the equation of time, 2 minutes on these days, is inside.
    """
    here_mjd = noon_mjd - longitude_deg / 360.0
    return here_mjd + np.arange(-600.0, 600.0, 4.0) / SECONDS_PER_DAY


def altitude_over(site: Site, limit_deg: float = 0.0) -> Quantity:
    """Return the Sun's altitude over a limit (deg) as a quantity of time."""
    return lambda mjd: sun(mjd, site).altitude_deg - limit_deg


def latitude_of(extreme_deg: float, longitude_deg: float, mjd: Floats, sign: float) -> float:
    """Return the northern latitude (deg) where the Sun's extreme altitude in a span is so high.

    The lowest for a sign of -1, the highest for +1; by halving.
    """

    def over(latitude_deg: float) -> bool:
        altitudes_deg = sign * sun(mjd, site_at(latitude_deg, longitude_deg)).altitude_deg
        return float(altitudes_deg.max()) > sign * extreme_deg

    # Further north the midsummer Sun is higher at midnight and the midwinter Sun lower at noon.
    low_deg, high_deg = 40.0, 89.0
    for _ in range(26):
        middle_deg = (low_deg + high_deg) / 2.0
        low_deg, high_deg = (middle_deg, high_deg) if over(middle_deg) else (low_deg, middle_deg)
    return (low_deg + high_deg) / 2.0


@pytest.mark.parametrize("longitude_deg", LONGITUDES_DEG)
@pytest.mark.parametrize("limit", LIMITS)
@pytest.mark.parametrize("by_deg", [0.0002, 0.003])
def test_a_dusk_of_minutes_is_found(limit: str, longitude_deg: float, by_deg: float) -> None:
    dusk, dawn, limit_deg = LIMITS[limit]
    mjd = minutes_around(night_span_mjd(MIDSUMMER, "UTC")[0] + 0.5, longitude_deg)
    latitude_deg = latitude_of(limit_deg - by_deg, longitude_deg, mjd, -1.0)
    site = site_at(latitude_deg, longitude_deg)
    found = almanac(site, MIDSUMMER)
    below = mjd[sun(mjd, site).altitude_deg < limit_deg]
    assert 1.0 < (below[-1] - below[0]) * 1440.0 < 10.0
    assert getattr(found, dusk) == pytest.approx(below[0], abs=APART_S / SECONDS_PER_DAY)
    assert getattr(found, dawn) == pytest.approx(below[-1], abs=APART_S / SECONDS_PER_DAY)
    assert dark_spans(found, site, limit_deg) == [(getattr(found, dusk), getattr(found, dawn))]
    assert found.sun_state == "rises and sets"


@pytest.mark.parametrize("longitude_deg", LONGITUDES_DEG)
@pytest.mark.parametrize("limit", LIMITS)
def test_a_night_that_just_misses_it_has_none(limit: str, longitude_deg: float) -> None:
    dusk, dawn, limit_deg = LIMITS[limit]
    mjd = minutes_around(night_span_mjd(MIDSUMMER, "UTC")[0] + 0.5, longitude_deg)
    latitude_deg = latitude_of(limit_deg + 0.0002, longitude_deg, mjd, -1.0)
    found = almanac(site_at(latitude_deg, longitude_deg), MIDSUMMER)
    assert [getattr(found, dusk), getattr(found, dawn)] == [None, None]
    assert (found.sun_state == "never sets") is (limit == "sunset")


@pytest.mark.parametrize("longitude_deg", [-3.0, -1.7, 1.7, 3.0])
def test_a_day_of_minutes_is_found_beside_noon(longitude_deg: float) -> None:
    """The winter Sun shows itself for minutes, close to one of the noons that bound the night."""
    begin_mjd, end_mjd = night_span_mjd(MIDWINTER, "UTC")
    noon_mjd = begin_mjd if longitude_deg < 0.0 else end_mjd
    mjd = minutes_around(noon_mjd, longitude_deg)
    latitude_deg = latitude_of(RISE_SET_ALTITUDE_DEG + 0.0005, longitude_deg, mjd, 1.0)
    site = site_at(latitude_deg, longitude_deg)
    up = mjd[sun(mjd, site).altitude_deg > RISE_SET_ALTITUDE_DEG]
    assert 1.0 < (up[-1] - up[0]) * 1440.0 < 10.0
    assert begin_mjd < up[0] < up[-1] < end_mjd
    found = crossings(altitude_over(site, RISE_SET_ALTITUDE_DEG), begin_mjd, end_mjd)
    assert [each.rising for each in found] == [True, False]
    times = [each.mjd for each in found]
    assert times == pytest.approx([up[0], up[-1]], abs=APART_S / SECONDS_PER_DAY)
    assert almanac(site, MIDWINTER).sun_state == "rises and sets"


def test_the_lowest_sun_is_met_within_a_hundredth_of_an_arcsecond() -> None:
    """What `sampled` promises of an altitude on its grid of ten minutes."""
    for latitude_deg in (-70.0, -33.0, 0.0, 48.0, 66.0, 89.0):
        site = site_at(latitude_deg, 0.7)
        begin_mjd, end_mjd = night_span_mjd(MIDSUMMER, "UTC")
        moments, altitudes_deg = sampled(altitude_over(site), begin_mjd, end_mjd)
        assert np.all(np.diff(moments) >= 0.0)
        around = minutes_around(float(moments[np.argmin(altitudes_deg)]), 0.0)
        around = around[(around >= begin_mjd) & (around <= end_mjd)]
        missed_deg = float(altitudes_deg.min() - sun(around, site).altitude_deg.min())
        assert missed_deg * 3600.0 < 0.01
