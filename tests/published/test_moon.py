"""The Moon and the Sun against tabulated places, illuminations and phases."""

from __future__ import annotations

import math
from collections.abc import Callable

import erfa
import numpy as np
import pytest
from astropy.coordinates import Angle
from numpy.typing import NDArray

from engine.logbook import Site
from engine.positions import Body, crossings, moon, separation_deg, sun
from engine.positions.bodies import lit_share, phase_angle_deg
from engine.positions.earth import MJD_ZERO, tt_mjd
from engine.times import mjd_from_iso
from tests.published.rows import Row, agrees, all_rows, rows, told
from tests.published.test_altaz import site_of
from tests.published.test_sidereal import utc_mjd_of_ut1

Floats = NDArray[np.float64]


def equinox_place_deg(body: Body, mjd: float) -> tuple[float, float]:
    """Return right ascension counted from the equinox of date, and declination (deg)."""
    zero_deg = math.degrees(float(erfa.eo06a(MJD_ZERO, float(tt_mjd(mjd)))))
    return float(body.ra_deg[0]) - zero_deg, float(body.dec_deg[0])


@pytest.mark.parametrize("row", rows("moon.usno.topo.", "sun.usno.topo."))
def test_topocentric_place_and_distance(row: Row) -> None:
    """The tables' right ascension is of the equinox, with diurnal aberration: 0.3 arcsec."""
    inputs = row["inputs"]
    mjd = utc_mjd_of_ut1(inputs["ut1"])
    site = site_of(inputs)
    body = moon(mjd, site) if row["id"].startswith("moon") else sun(mjd, site)
    ra_deg, dec_deg = with_diurnal_aberration(body, *equinox_place_deg(body, mjd), site)
    value = 3600.0 * float(
        separation_deg(
            ra_deg, dec_deg, Angle(inputs["ra"], unit="hourangle").deg,
            Angle(inputs["dec"], unit="deg").deg,
        )
    )  # fmt: skip
    assert agrees(row, value), told(row, value)
    distance_km = inputs.get("dist_km", 149597870.7 * inputs.get("dist_au", 0.0))
    assert float(body.distance_km[0]) == pytest.approx(distance_km, rel=1.5e-4)


def with_diurnal_aberration(
    body: Body, ra_deg: float, dec_deg: float, site: Site
) -> tuple[float, float]:
    """Return a place (deg) moved as the turning of the site moves it (Green 1985, ch. 8)."""
    shift_deg = 0.3192 / 3600.0 * math.cos(math.radians(site.latitude_deg))
    hour_angle_rad = math.radians(15.0 * float(body.hour_angle_h[0]))
    dec_rad = math.radians(dec_deg)
    return (
        ra_deg + shift_deg * math.cos(hour_angle_rad) / math.cos(dec_rad),
        dec_deg + shift_deg * math.sin(hour_angle_rad) * math.sin(dec_rad),
    )


@pytest.mark.parametrize("row", rows("moon.usno.illum."))
def test_illumination(row: Row) -> None:
    """The table is for the Earth's centre; seen from a site it differs by up to 0.7 %."""
    mjd = mjd_from_iso(row["inputs"]["utc"])
    values = [
        float(moon(mjd, site_of({"lat": 0.0, "lon": longitude})).illumination[0])
        for longitude in (-180.0, -90.0, 0.0, 90.0)
    ]
    # The mean of four sites around the equator is that of the centre.
    value = float(np.mean(values))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("moon.meeus48a."))
def test_phase_of_a_worked_example(row: Row) -> None:
    """The example's own vectors, seen from the Earth's centre."""
    see = row["inputs"].get("see", row["id"])
    inputs = next(r for r in all_rows() if r["id"] == see)["inputs"]
    to_moon_km = erfa.s2p(*np.deg2rad([inputs["ra_m"], inputs["dec_m"]]), inputs["D_km"])
    to_sun_km = erfa.s2p(*np.deg2rad([inputs["ra_s"], inputs["dec_s"]]), inputs["R_km"])
    phase_deg = phase_angle_deg(to_moon_km, to_sun_km, np.zeros(3))
    value = float(phase_deg if row["id"].endswith(".i") else lit_share(phase_deg))
    assert agrees(row, value), told(row, value)


def from_the_centre_km(body_at: Callable[[Floats, Site], Body], mjd: Floats) -> Floats:
    """Return vectors (T, 3) from the Earth's centre: the mean of what two antipodes see."""
    vectors = [
        erfa.s2p(np.deg2rad(seen.ra_deg), np.deg2rad(seen.dec_deg), seen.distance_km)
        for seen in (body_at(mjd, site_of({"lat": 0.0, "lon": lon})) for lon in (0.0, 180.0))
    ]
    return np.asarray((vectors[0] + vectors[1]) / 2.0)


@pytest.mark.parametrize("row", rows("moon.meeus47a."))
def test_geocentric_place(row: Row) -> None:
    """The example counts right ascension from the equinox of date."""
    tt = mjd_from_iso(row["inputs"]["tt"])
    mjd = np.array([2.0 * tt - float(tt_mjd(tt))])
    ra_rad, dec_rad = erfa.c2s(from_the_centre_km(moon, mjd)[0])
    ra_rad = ra_rad - erfa.eo06a(MJD_ZERO, tt)
    value = math.degrees(ra_rad if row["id"].endswith(".ra") else dec_rad)
    assert agrees(row, value), told(row, value)


PHASE_LONGITUDE_DEG = {"new": 0.0, "fq": 90.0, "full": 180.0}


def ecliptic_longitude_deg(to_body_km: Floats, mjd: Floats) -> Floats:
    """Return longitudes (deg) on the ecliptic of date of CIRS vectors (T, 3)."""
    tt = tt_mjd(mjd)
    ra_rad, dec_rad = erfa.c2s(to_body_km)
    ra_rad, tilt_rad = ra_rad - erfa.eo06a(MJD_ZERO, tt), erfa.obl06(MJD_ZERO, tt)
    east = np.sin(ra_rad) * np.cos(tilt_rad) + np.tan(dec_rad) * np.sin(tilt_rad)
    return np.asarray(np.rad2deg(np.arctan2(east, np.cos(ra_rad))))


@pytest.mark.parametrize("row", rows("moonphase."))
def test_moment_of_a_phase(row: Row) -> None:
    """Found with the engine's own finder; the tables are rounded to the minute."""
    expected_mjd = mjd_from_iso(row["expected"])

    def past_the_phase(mjd: Floats) -> Floats:
        moon_deg, sun_deg = (
            ecliptic_longitude_deg(from_the_centre_km(body, mjd), mjd) for body in (moon, sun)
        )
        over_deg = moon_deg - sun_deg - PHASE_LONGITUDE_DEG[row["inputs"]["kind"]]
        return np.asarray(np.mod(over_deg + 180.0, 360.0) - 180.0)

    found = crossings(past_the_phase, expected_mjd - 1.0, expected_mjd + 1.0, 0.1)
    assert len(found) == 1
    value = 86400.0 * (found[0].mjd - expected_mjd)
    assert abs(value) <= row["tol_abs"], told(row, value)
