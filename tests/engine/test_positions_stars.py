"""Stars over the site: astropy's full transformation as second opinion, and what must always hold.

astropy goes from the ICRS to AltAz anew at each moment (ERFA apco13); ours uses one apparent place
a night and plain trigonometry. Both read the same Earth-rotation table.
"""

from __future__ import annotations

import math

import astropy.units as u
import erfa
import numpy as np
import pytest
from astropy.coordinates import AltAz, EarthLocation, SkyCoord
from astropy.time import Time
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.logbook import Site
from engine.positions import (
    apparent_places,
    horizontal,
    prepare_astropy,
    separation_deg,
    sidereal_time_h,
)
from engine.positions.earth import earth_table, ut1_minus_utc_s
from engine.positions.stars import DIURNAL_ABERRATION_RAD

ARCSEC_PER_DEG = 3600.0
STAR_COUNT = 30
# What is left: the apparent place of mid-night serves seven hours either way. Less of a difference
# than polar motion or diurnal aberration, so that neither can be forgotten or turned round.
APART_ARCSEC = 0.2
# Invented places: a pole, both poles nearly, both sides of the date line, the equator, a peak.
SITES = [
    (90.0, 0.0, 0.0),
    (89.9, 12.0, 0.0),
    (-89.9, -71.0, 2800.0),
    (0.0, -179.95, 3.0),
    (-17.3, 179.95, 900.0),
    (-33.2, -70.6, 2300.0),
    (52.1, 5.2, 10.0),
    (75.0, 120.0, 2390.0),
    (-44.0, 170.4, 1030.0),
]
# The evenings (UTC MJD), from January 2024 to October 2027.
EVENINGS_MJD = [60310.9, 60402.2, 60488.3, 60676.1, 60855.7, 61041.2, 61222.6, 61402.4, 61694.8]


def site_at(latitude_deg: float, longitude_deg: float, elevation_m: float = 1000.0) -> Site:
    """Return an invented site."""
    return Site(
        name="Invented",
        latitude_deg=latitude_deg,
        longitude_deg=longitude_deg,
        elevation_m=elevation_m,
        timezone="UTC",
    )


def location_of(site: Site) -> EarthLocation:
    """Return astropy's description of a site."""
    return EarthLocation.from_geodetic(
        site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
    )


def stars(seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Return right ascensions and declinations (deg) spread evenly over the sphere, poles too."""
    random = np.random.default_rng(seed)
    dec_deg = np.rad2deg(np.arcsin(random.uniform(-1.0, 1.0, STAR_COUNT)))
    dec_deg[:2] = (89.99, -89.99)
    return random.uniform(0.0, 360.0, STAR_COUNT), dec_deg


@pytest.mark.parametrize(("number", "place"), list(enumerate(SITES)))
def test_all_night_with_astropy(number: int, place: tuple[float, float, float]) -> None:
    prepare_astropy()
    site = site_at(*place)
    ra_deg, dec_deg = stars(number)
    for evening_mjd in (EVENINGS_MJD[number], EVENINGS_MJD[-1 - number] + 0.3):
        mjd = evening_mjd + np.arange(0.0, 14.0, 0.5) / 24.0
        ours = horizontal(apparent_places(ra_deg, dec_deg, float(np.mean(mjd))), mjd, site)
        frame = AltAz(obstime=Time(mjd, format="mjd", scale="utc"), location=location_of(site))
        theirs = SkyCoord(ra_deg[:, None] * u.deg, dec_deg[:, None] * u.deg).transform_to(frame)
        apart_arcsec = ARCSEC_PER_DEG * separation_deg(
            ours.azimuth_deg, ours.altitude_deg, theirs.az.deg, theirs.alt.deg
        )
        assert float(apart_arcsec.max()) < APART_ARCSEC


def test_beyond_the_table_only_the_unknown_is_left() -> None:
    """Astropy, told the UT1 that ours holds, still takes a mean pole: under an arcsecond."""
    prepare_astropy()
    site = site_at(*SITES[5])
    ra_deg, dec_deg = stars(77)
    for days in (200.9, 500.2):
        mjd = earth_table().last_mjd + days + np.arange(0.0, 14.0, 0.5) / 24.0
        when = Time(mjd, format="mjd", scale="utc")
        when.delta_ut1_utc = ut1_minus_utc_s(mjd)
        frame = AltAz(obstime=when, location=location_of(site))
        theirs = SkyCoord(ra_deg[:, None] * u.deg, dec_deg[:, None] * u.deg).transform_to(frame)
        ours = horizontal(apparent_places(ra_deg, dec_deg, float(np.mean(mjd))), mjd, site)
        apart_arcsec = ARCSEC_PER_DEG * separation_deg(
            ours.azimuth_deg, ours.altitude_deg, theirs.az.deg, theirs.alt.deg
        )
        assert float(apart_arcsec.max()) < 1.0


def test_proper_motion_and_its_epoch_agree_with_astropy() -> None:
    """A star as fast as any known moves 10 arcsec a year: an epoch mistaken is seen at once."""
    mjd, site = 61222.6, site_at(*SITES[5])
    frame = AltAz(obstime=Time(mjd, format="mjd", scale="utc"), location=location_of(site))
    for epoch_yr in (1991.25, 2000.0, 2016.0):
        star = SkyCoord(
            269.45 * u.deg,
            4.69 * u.deg,
            pm_ra_cosdec=-802.0 * u.mas / u.yr,
            pm_dec=10362.0 * u.mas / u.yr,
            distance=1.83 * u.pc,  # astropy asks for one; what follows leaves the parallax out
            obstime=Time(epoch_yr, format="jyear"),
        )
        moved = star.apply_space_motion(new_obstime=Time(mjd, format="mjd", scale="utc"))
        theirs = SkyCoord(moved.ra, moved.dec).transform_to(frame)
        ours = horizontal(
            apparent_places(
                269.45,
                4.69,
                mjd,
                pm_ra_mas_per_yr=-802.0,
                pm_dec_mas_per_yr=10362.0,
                epoch_yr=epoch_yr,
            ),
            mjd,
            site,
        )
        apart_deg = separation_deg(
            ours.azimuth_deg, ours.altitude_deg, theirs.az.deg, theirs.alt.deg
        )
        assert float(apart_deg.max()) * ARCSEC_PER_DEG < APART_ARCSEC


def test_parallactic_angle_is_erfas() -> None:
    site = site_at(28.4, -16.6)
    places = apparent_places(np.array([10.0, 200.0, 330.0]), np.array([-40.0, 5.0, 61.0]), 61222.6)
    where = horizontal(places, 61222.6 + np.linspace(0.0, 0.9, 40), site)
    theirs = erfa.hd2pa(
        np.deg2rad(15.0 * where.hour_angle_h),
        np.deg2rad(places.dec_deg)[:, None],
        math.radians(site.latitude_deg),
    )
    apart = np.angle(np.exp(1j * (np.deg2rad(where.parallactic_angle_deg) - theirs)))
    # Polar motion moves the latitude by half an arcsecond; near the zenith that turns the angle.
    assert float(np.abs(np.rad2deg(apart)).max()) < 0.01


def test_hour_angle_is_sidereal_time_less_right_ascension() -> None:
    """With the equinox for both: CIRS right ascensions count from another zero on the equator."""
    mjd, site = 61222.6, site_at(-33.2, -70.6)
    places = apparent_places(120.0, -20.0, mjd)
    tt_mjd = Time(mjd, format="mjd", scale="utc").tt.mjd
    zero_deg = math.degrees(float(erfa.eo06a(2400000.5, tt_mjd)))
    ra_of_equinox_h = (float(places.ra_deg[0]) - zero_deg) / 15.0
    expected_h = float(sidereal_time_h(mjd, site.longitude_deg)) - ra_of_equinox_h
    found_h = float(horizontal(places, mjd, site).hour_angle_h[0, 0])
    # 0.1 s of time is 1.5 arcsec; polar motion is in one and not in the other.
    assert (found_h - expected_h + 12.0) % 24.0 - 12.0 == pytest.approx(0.0, abs=0.1 / 3600.0)


@settings(derandomize=True, deadline=None)
@given(
    latitude_deg=st.floats(-90.0, 90.0),
    longitude_deg=st.floats(-180.0, 360.0),
    ra_deg=st.floats(0.0, 360.0),
    dec_deg=st.floats(-90.0, 90.0),
    mjd=st.floats(59000.0, 63000.0),
)
def test_every_direction_at_every_site_is_somewhere(
    latitude_deg: float, longitude_deg: float, ra_deg: float, dec_deg: float, mjd: float
) -> None:
    where = horizontal(
        apparent_places(ra_deg, dec_deg, mjd), mjd, site_at(latitude_deg, longitude_deg)
    )
    assert -90.0 <= float(where.altitude_deg[0, 0]) <= 90.0
    assert 0.0 <= float(where.azimuth_deg[0, 0]) < 360.0
    assert -12.0 <= float(where.hour_angle_h[0, 0]) < 12.0
    assert -180.0 <= float(where.parallactic_angle_deg[0, 0]) <= 180.0


@settings(derandomize=True, deadline=None)
@given(latitude_deg=st.floats(-89.0, 89.0), mjd=st.floats(59000.0, 63000.0))
def test_a_star_is_as_high_as_its_meridian_allows(latitude_deg: float, mjd: float) -> None:
    """No altitude exceeds 90 less the difference of latitude and declination."""
    dec_deg = np.linspace(-80.0, 80.0, 9)
    places = apparent_places(np.full(9, 77.0), dec_deg, mjd)
    where = horizontal(places, mjd + np.linspace(0.0, 1.0, 25), site_at(latitude_deg, 20.0))
    ceiling_deg = 90.0 - np.abs(latitude_deg - places.dec_deg)
    slack_deg = (0.5 + math.degrees(DIURNAL_ABERRATION_RAD) * ARCSEC_PER_DEG) / ARCSEC_PER_DEG
    assert np.all(where.altitude_deg <= ceiling_deg[:, None] + slack_deg)


def test_nan_stays_nan_and_hurts_no_neighbour() -> None:
    places = apparent_places(np.array([np.nan, 30.0]), np.array([10.0, 10.0]), 61222.6)
    where = horizontal(places, 61222.6, site_at(10.0, 10.0))
    assert np.isnan(where.altitude_deg[0, 0])
    assert np.isfinite(where.altitude_deg[1, 0])


def test_one_place_of_many() -> None:
    places = apparent_places(np.array([10.0, 30.0]), np.array([10.0, 20.0]), 61222.6)
    only = places.only(1)
    assert only.ra_deg.shape == (1,)
    assert float(only.dec_deg[0]) == float(places.dec_deg[1])
