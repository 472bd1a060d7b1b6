"""The almanac: astroplan and PyEphem as second opinions, and nights that are not ordinary.

astroplan searches astropy's own positions; PyEphem has series of its own and no table of the
Earth's rotation, so that it differs by UT1 - UTC, an arcsecond or two in these years.
"""

from __future__ import annotations

from collections.abc import Callable
from datetime import date, timedelta
from functools import cache

import astropy.units as u
import ephem
import numpy as np
import pytest
from astroplan import FixedTarget, Observer
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.time import Time
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.logbook import Site
from engine.positions import (
    Almanac,
    almanac,
    apparent_places,
    crossings,
    dark_spans,
    horizontal,
    moon,
    prepare_astropy,
    separation_deg,
    sun,
)
from engine.positions.almanac import RISE_SET_ALTITUDE_DEG, SUN_STATES
from engine.positions.second_opinion import SEARCHES, astroplans_almanac

SECONDS_PER_DAY = 86400.0
# astroplan draws straight lines between grid points; with this many they cost it under a second.
ASTROPLAN_POINTS = 400
APART_S = 2.0


def site_at(latitude_deg: float, longitude_deg: float, elevation_m: float = 0.0) -> Site:
    """Return an invented site in the nautical zone of its longitude."""
    hours = round(longitude_deg / 15.0)
    # POSIX counts zones west of Greenwich as positive.
    zone = f"Etc/GMT{-hours:+d}" if hours else "Etc/GMT"
    return Site(
        name="Invented",
        latitude_deg=latitude_deg,
        longitude_deg=longitude_deg,
        elevation_m=elevation_m,
        timezone=zone,
    )


SITES = {
    "south": site_at(-33.2, -70.6, 2300.0),
    "north": site_at(52.1, 5.2, 10.0),
    "island": site_at(19.7, -155.5, 4100.0),
}
NIGHTS = [date(2024, 3, 20), date(2025, 12, 21), date(2026, 5, 20), date(2027, 9, 1)]
CASES = [
    pytest.param(SITES[name], night, id=f"{name}-{night}") for name in SITES for night in NIGHTS
]


@cache
def observer_of(latitude_deg: float, longitude_deg: float, elevation_m: float) -> Observer:
    """Return astroplan's observer: no air, so that altitudes are geometric like ours."""
    prepare_astropy()
    place = EarthLocation.from_geodetic(
        longitude_deg * u.deg, latitude_deg * u.deg, elevation_m * u.m
    )
    return Observer(location=place, timezone="UTC", pressure=0.0 * u.bar)


def astroplans(site: Site) -> Observer:
    """Return astroplan's observer at a site."""
    return observer_of(site.latitude_deg, site.longitude_deg, site.elevation_m)


@pytest.mark.parametrize(("site", "night"), CASES)
def test_times_of_a_night_are_astroplans(site: Site, night: date) -> None:
    ours = almanac(site, night)
    for name, theirs_mjd in astroplans_almanac(site, ours).items():
        found_mjd: float | None = getattr(ours, name)
        if found_mjd is None or theirs_mjd is None:
            assert found_mjd is theirs_mjd, name
        else:
            apart_s = SECONDS_PER_DAY * abs(theirs_mjd - found_mjd)
            assert apart_s < APART_S, f"{name}: {apart_s:.1f} s"


@pytest.mark.parametrize(("site", "night"), CASES)
def test_moonlight_of_a_night_is_astroplans(site: Site, night: date) -> None:
    """Theirs is seen from the Earth's centre: within 1 %."""
    prepare_astropy()
    mjd = almanac(site, night).begin_mjd + 0.5
    theirs = astroplans(site).moon_illumination(Time(mjd, format="mjd", scale="utc"))
    assert float(moon(mjd, site).illumination[0]) == pytest.approx(float(theirs), abs=0.01)


@pytest.mark.parametrize("site", SITES.values(), ids=SITES.keys())
def test_phase_is_that_of_the_triangle_from_the_site(site: Site) -> None:
    """I = atan2(R sin psi, D - R cos psi) (Meeus ch. 48), all three seen from the site."""
    mjd = 61200.0 + np.linspace(0.0, 29.5, 60)
    to_sun, to_moon = sun(mjd, site), moon(mjd, site)
    elongation_rad = np.deg2rad(
        separation_deg(to_sun.ra_deg, to_sun.dec_deg, to_moon.ra_deg, to_moon.dec_deg)
    )
    phase_rad = np.arctan2(
        to_sun.distance_km * np.sin(elongation_rad),
        to_moon.distance_km - to_sun.distance_km * np.cos(elongation_rad),
    )
    # Aberration, 20 arcsec, is in the Sun's place and not in the phase.
    assert to_moon.phase_angle_deg == pytest.approx(np.rad2deg(phase_rad), abs=0.01)
    assert to_moon.illumination == pytest.approx((1.0 + np.cos(phase_rad)) / 2.0, abs=1e-4)


@pytest.mark.parametrize(("site", "night"), CASES[::3])
@pytest.mark.parametrize(("ra_deg", "dec_deg"), [(83.6, 22.0), (201.3, -11.2), (10.7, 1.3)])
def test_a_target_rises_and_sets_when_astroplan_says(
    site: Site, night: date, ra_deg: float, dec_deg: float
) -> None:
    prepare_astropy()
    begin_mjd = almanac(site, night).begin_mjd
    begin = Time(begin_mjd, format="mjd", scale="utc")
    target = FixedTarget(SkyCoord(ra_deg * u.deg, dec_deg * u.deg), name="invented")
    place = apparent_places(ra_deg, dec_deg, begin_mjd + 0.5)
    found = crossings(
        lambda mjd: horizontal(place, mjd, site).altitude_deg[0] - 20.0, begin_mjd, begin_mjd + 1.0
    )
    assert {each.rising for each in found} == {True, False}
    for each in found:
        ask = (
            astroplans(site).target_rise_time if each.rising else (astroplans(site).target_set_time)
        )
        theirs = ask(
            begin, target, which="next", horizon=20.0 * u.deg, n_grid_points=ASTROPLAN_POINTS
        )
        # A day of stars is four minutes short: the same event may come twice in ours.
        apart_s = SECONDS_PER_DAY * min(abs(float(theirs.mjd) - other.mjd) for other in found)
        assert apart_s < APART_S


@pytest.mark.parametrize("site", SITES.values(), ids=SITES.keys())
def test_sun_and_moon_are_where_pyephem_has_them(site: Site) -> None:
    """Sun within 5 arcsec, Moon within 15 (our series is good to 10), all through four years."""
    watcher = ephem.Observer()
    watcher.lat, watcher.lon = str(site.latitude_deg), str(site.longitude_deg)
    watcher.elevation, watcher.pressure = site.elevation_m, 0.0
    mjd = 60310.0 + np.arange(0.0, 1400.0, 13.7)
    for body, ours, allowed_arcsec in (
        (ephem.Sun(), sun(mjd, site), 5.0),
        (ephem.Moon(), moon(mjd, site), 15.0),
    ):
        for index, each_mjd in enumerate(mjd):
            # PyEphem counts days from 1899 December 31, noon.
            watcher.date = ephem.Date(float(each_mjd) - 15019.5)
            body.compute(watcher)
            apart_deg = separation_deg(
                ours.azimuth_deg[index], ours.altitude_deg[index],
                np.rad2deg(float(body.az)), np.rad2deg(float(body.alt)),
            )  # fmt: skip
            assert 3600.0 * float(apart_deg) < allowed_arcsec
            distance_km = body.earth_distance * 149597870.7
            assert float(ours.distance_km[index]) == pytest.approx(distance_km, rel=1e-4)


def test_the_sun_never_rises_in_polar_night() -> None:
    site, night = site_at(78.2, 15.6), date(2026, 12, 21)
    found = almanac(site, night)
    assert found.sun_state == "never rises"
    assert found.sunset is None
    assert found.sunrise is None
    # Nor does it come to civil twilight; but noon is nautical twilight, so the sky does darken.
    assert found.civil_dusk is None
    assert found.nautical_dusk is not None
    assert found.nautical_dawn is not None
    assert dark_spans(found, site, -6.0) == [(found.begin_mjd, found.end_mjd)]
    assert astroplans_almanac(site, found)["sunrise"] is None


def test_the_sun_never_sets_on_a_polar_day() -> None:
    site, night = site_at(78.2, 15.6), date(2026, 6, 21)
    found = almanac(site, night)
    assert found.sun_state == "never sets"
    assert [found.sunset, found.civil_dusk, found.astronomical_dawn, found.sunrise] == [None] * 4
    assert dark_spans(found, site, RISE_SET_ALTITUDE_DEG) == []
    assert astroplans_almanac(site, found)["sunset"] is None


def test_a_white_night_has_a_sunset_and_no_darkness() -> None:
    """At 61.9 deg the Sun sinks to 90 - 61.9 - 23.4 = 4.7 deg: not to civil twilight."""
    site = site_at(61.9, 30.3)
    found = almanac(site, date(2026, 6, 21))
    assert found.sun_state == "rises and sets"
    assert found.sunset is not None
    assert found.sunrise is not None
    assert [found.civil_dusk, found.astronomical_dusk, found.civil_dawn] == [None] * 3
    assert dark_spans(found, site, -6.0) == []


def test_an_ordinary_night_is_dark_from_dusk_to_dawn() -> None:
    site = SITES["south"]
    found = almanac(site, date(2026, 5, 20))
    assert found.astronomical_dusk is not None
    assert found.astronomical_dawn is not None
    (span,) = dark_spans(found, site, -18.0)
    assert span == pytest.approx((found.astronomical_dusk, found.astronomical_dawn), abs=1e-5)


def happenings(found: Almanac) -> list[float]:
    """Return what the Sun does in a night, in the order in which it must, without what it skips."""
    ordered = (
        found.begin_mjd, found.sunset, found.civil_dusk, found.nautical_dusk,
        found.astronomical_dusk, found.astronomical_dawn, found.nautical_dawn, found.civil_dawn,
        found.sunrise, found.end_mjd,
    )  # fmt: skip
    return [each for each in ordered if each is not None]


sites = st.builds(site_at, st.floats(-90.0, 90.0), st.floats(-172.0, 172.0))
nights = st.dates(date(2024, 1, 1), date(2028, 12, 31))


@settings(derandomize=True, deadline=None, max_examples=30)
@given(site=sites, night=nights)
def test_every_night_everywhere_is_in_order(site: Site, night: date) -> None:
    found = almanac(site, night)
    times = happenings(found)
    assert times == sorted(times)
    assert 0.0 <= found.moon_illumination <= 1.0
    assert found.sun_state in SUN_STATES
    for name, method, limit_deg in SEARCHES:
        mjd: float | None = getattr(found, name)
        if mjd is None:
            continue
        body: Callable[..., object] = moon if "moon" in method else sun
        altitudes_deg = body(np.array([mjd]), site).altitude_deg  # type: ignore[attr-defined]
        # Half a second of time is 7.5 arcsec.
        assert float(altitudes_deg[0]) == pytest.approx(limit_deg, abs=10.0 / 3600.0)


@settings(derandomize=True, deadline=None, max_examples=15)
@given(latitude_deg=st.floats(-45.0, 45.0), longitude_deg=st.floats(-172.0, 172.0), night=nights)
def test_away_from_the_poles_nothing_is_missing(
    latitude_deg: float, longitude_deg: float, night: date
) -> None:
    found = almanac(site_at(latitude_deg, longitude_deg), night)
    assert found.sun_state == "rises and sets"
    assert len(happenings(found)) == 10


def test_about_one_night_a_month_has_no_moonrise() -> None:
    """The Moon rises 50 minutes later each day: 30 days have 29 moonrises."""
    begin = date(2026, 1, 1)
    rises = [
        almanac(SITES["north"], begin + timedelta(days=day)).moonrise is not None
        for day in range(30)
    ]
    assert sum(rises) == 29
