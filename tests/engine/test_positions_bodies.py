"""Sun and Moon against astropy's own: the same theory by another way, so the agreement is close.

What is tested is the way from the theory to the site: time scales, light-time, aberration, the
rotation of the Earth, the parallax of the site. PyEphem, in the tests of the almanac, has a theory
of its own.
"""

from __future__ import annotations

from collections.abc import Callable

import astropy.units as u
import erfa
import numpy as np
import pytest
from astropy.coordinates import AltAz, EarthLocation, get_body
from astropy.time import Time
from numpy.typing import NDArray

from engine.logbook import Site
from engine.positions import Body, moon, prepare_astropy, separation_deg, sun
from engine.positions.earth import MJD_ZERO, tt_mjd

Floats = NDArray[np.float64]

ARCSEC_PER_DEG = 3600.0
# Diurnal aberration is 0.3, the Moon's light-time 0.7, polar motion 0.5: none can be forgotten.
APART_ARCSEC = 0.1
SITE_COUNT = 12
FIRST_MJD, LAST_MJD = 60310.0, 61690.0  # January 2024 to October 2027


def some_sites() -> list[Site]:
    """Return both poles, both sides of the date line, and sites spread evenly over the Earth."""
    random = np.random.default_rng(5)
    latitudes_deg = np.rad2deg(np.arcsin(random.uniform(-1.0, 1.0, SITE_COUNT)))
    longitudes_deg = random.uniform(-180.0, 180.0, SITE_COUNT)
    latitudes_deg[:2] = (90.0, -90.0)
    longitudes_deg[2:4] = (180.0, -179.99)
    return [
        Site(
            name="Invented",
            latitude_deg=float(latitude_deg),
            longitude_deg=float(longitude_deg),
            elevation_m=float(elevation_m),
            timezone="UTC",
        )
        for latitude_deg, longitude_deg, elevation_m in zip(
            latitudes_deg, longitudes_deg, random.uniform(0.0, 5000.0, SITE_COUNT), strict=True
        )
    ]


def theirs(name: str, mjd: Floats, site: Site) -> AltAz:
    """Return where astropy sees a body from a site, without refraction."""
    place = EarthLocation.from_geodetic(
        site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
    )
    when = Time(mjd, format="mjd", scale="utc")
    return get_body(name, when, place).transform_to(AltAz(obstime=when, location=place))


@pytest.mark.parametrize(("name", "ours_at"), [("sun", sun), ("moon", moon)])
def test_all_night_with_astropy(name: str, ours_at: Callable[[Floats, Site], Body]) -> None:
    prepare_astropy()
    random = np.random.default_rng(11)
    for site in some_sites():
        mjd = random.uniform(FIRST_MJD, LAST_MJD) + np.linspace(0.0, 15.0, 16) / 24.0
        ours, expected = ours_at(mjd, site), theirs(name, mjd, site)
        apart_arcsec = ARCSEC_PER_DEG * separation_deg(
            ours.azimuth_deg, ours.altitude_deg, expected.az.deg, expected.alt.deg
        )
        assert float(apart_arcsec.max()) < APART_ARCSEC, site
        # Theirs is from where the Earth will be when the light arrives: up to 1e-4 of a light-time.
        assert ours.distance_km == pytest.approx(expected.distance.km, rel=1.1e-4)


def test_a_span_of_months_is_as_good_as_a_night() -> None:
    """Within a night one matrix serves all minutes; beyond it each moment has its own."""
    site = some_sites()[5]
    mjd = FIRST_MJD + np.arange(0.0, 400.0, 40.0)
    for ours_at in (sun, moon):
        at_once = ours_at(mjd, site)
        one_by_one = [ours_at(np.array([each]), site) for each in mjd]
        # The pole moves by some tenths of an arcsecond in that time, and is taken at the mean.
        for axes in (("azimuth_deg", "altitude_deg"), ("ra_deg", "dec_deg")):
            single = [np.array([float(getattr(each, a)[0]) for each in one_by_one]) for a in axes]
            apart_deg = separation_deg(*(getattr(at_once, axis) for axis in axes), *single)
            assert float(apart_deg.max()) * ARCSEC_PER_DEG < 0.5


def test_the_moon_is_seen_a_light_time_ago() -> None:
    """From the centre of the Earth, as the mean of what two antipodes see."""
    mjd = np.array([61222.6])
    vectors = [
        erfa.s2p(np.deg2rad(seen.ra_deg), np.deg2rad(seen.dec_deg), seen.distance_km)
        for seen in (
            moon(mjd, Site(name="x", latitude_deg=0.0, longitude_deg=longitude_deg,
                           elevation_m=0.0, timezone="UTC"))
            for longitude_deg in (0.0, 180.0)
        )
    ]  # fmt: skip
    seen_km = (vectors[0] + vectors[1]) / 2.0
    light_time_days = float(np.linalg.norm(seen_km)) / 299792.458 / 86400.0
    tt = tt_mjd(mjd)
    now, then = (
        erfa.rxp(erfa.c2i06a(MJD_ZERO, tt), erfa.moon98(MJD_ZERO, at)["p"])
        for at in (tt, tt - light_time_days)
    )
    behind_arcsec = np.rad2deg(erfa.sepp(seen_km, now)) * ARCSEC_PER_DEG
    assert float(behind_arcsec[0]) == pytest.approx(0.7, abs=0.15)
    left_arcsec = np.rad2deg(erfa.sepp(seen_km, then)) * ARCSEC_PER_DEG
    assert float(left_arcsec[0]) < 0.01
