"""Altitude, azimuth and angles between directions against worked examples and other tests."""

from __future__ import annotations

import math
from typing import Any

import erfa
import numpy as np
import pytest
from astropy.coordinates import Angle

from engine.logbook import Site
from engine.positions import Horizontal, apparent_places, horizontal, separation_deg
from engine.positions.earth import MJD_ZERO, rotation_angle_rad, tt_mjd
from engine.positions.stars import DIURNAL_ABERRATION_RAD, horizontal_of, local_axes
from engine.times import mjd_from_iso
from tests.published.rows import Row, agrees, all_rows, rows, told
from tests.published.test_sidereal import utc_mjd_of_ut1

# A night on which the pole was within an arcsecond of its mean place, as on all nights.
ANY_MJD = 61222.6
# The rows of the bare rotation know nothing of aberration (0.3 arcsec) and the pole (0.5 arcsec).
BARE_RAD = math.radians(1.0 / 3600.0)


def site_of(inputs: dict[str, Any]) -> Site:
    """Return the site of a row."""
    longitude = next(inputs[name] for name in ("lon_east", "lon", "lon_east_deg") if name in inputs)
    latitude = next(inputs[name] for name in ("lat", "lat_deg") if name in inputs)
    return Site(
        name="Published",
        latitude_deg=degrees(latitude),
        longitude_deg=degrees(longitude),
        elevation_m=float(inputs.get("h_m", 0.0)),
        timezone="UTC",
    )


def degrees(angle: str | float) -> float:
    """Return an angle (deg) written as a number or as degrees, minutes and seconds."""
    return float(Angle(angle, unit="deg").deg) if isinstance(angle, str) else float(angle)


def inputs_of(row: Row) -> dict[str, Any]:
    """Return the inputs of a row, or of the row it points to."""
    see = row["inputs"].get("see")
    return dict(next(r for r in all_rows() if r["id"] == see)["inputs"] if see else row["inputs"])


def at_hour_angle(hour_angle_rad: float, dec_rad: float, latitude_rad: float) -> Horizontal:
    """Return where our rotation puts a direction; the longitude is chosen to give the angle."""
    site = Site(
        name="Any",
        latitude_deg=math.degrees(latitude_rad),
        longitude_deg=0.0,
        elevation_m=0.0,
        timezone="UTC",
    )
    longitude_rad = local_axes(ANY_MJD, site).longitude_rad
    ra_rad = float(rotation_angle_rad(ANY_MJD)) + longitude_rad - hour_angle_rad
    return horizontal_of(np.array(ra_rad), np.array(dec_rad), np.array(ANY_MJD), site)


def towards(row: Row, hour_angle_rad: float) -> tuple[float, float, float]:
    """Return azimuth, altitude and parallactic angle (rad) at an hour angle, for a row's star."""
    inputs = row["inputs"]
    where = at_hour_angle(hour_angle_rad, inputs["dec_rad"], inputs["lat_rad"])
    return (
        math.radians(float(where.azimuth_deg)),
        math.radians(float(where.altitude_deg)),
        math.radians(float(where.parallactic_angle_deg)),
    )


@pytest.mark.parametrize("row", rows("altaz.erfa.hd2ae.el", "altaz.pal.el"))
def test_altitude_of_an_hour_angle(row: Row) -> None:
    _, value, _ = towards(row, row["inputs"]["ha_rad"])
    assert value == pytest.approx(row["expected"], abs=BARE_RAD), told(row, value)


@pytest.mark.parametrize("row", rows("altaz.erfa.hd2ae.az", "altaz.pal.az"))
def test_azimuth_of_an_hour_angle_and_its_rate(row: Row) -> None:
    hour_angle_rad = row["inputs"]["ha_rad"]
    value, altitude_rad, _ = towards(row, hour_angle_rad)
    if row["id"].endswith("rate"):
        value = rate_per_rad(row, hour_angle_rad, 0)
    allowed = BARE_RAD / math.cos(altitude_rad) * 2.0
    assert value == pytest.approx(row["expected"], abs=allowed), told(row, value)


@pytest.mark.parametrize("row", rows("altaz.pal.parate"))
def test_rate_of_the_parallactic_angle(row: Row) -> None:
    hour_angle_rad = row["inputs"]["ha_rad"]
    _, altitude_rad, _ = towards(row, hour_angle_rad)
    value = rate_per_rad(row, hour_angle_rad, 2)
    allowed = BARE_RAD / math.cos(altitude_rad) * 2.0
    assert value == pytest.approx(row["expected"], abs=allowed), told(row, value)


def rate_per_rad(row: Row, hour_angle_rad: float, which: int) -> float:
    """Return the central difference of one of `towards`, per radian of hour angle."""
    step = 1e-3
    after, before = (towards(row, hour_angle_rad + s)[which] for s in (step, -step))
    return (after - before) / (2.0 * step)


@pytest.mark.parametrize("row", rows("altaz.erfa.ae2hd.h"))
def test_an_hour_angle_leads_back(row: Row) -> None:
    """No door goes this way: the published hour angle must lead to the altitude it came from."""
    azimuth, altitude, latitude = (row["inputs"][name] for name in ("az_rad", "el_rad", "lat_rad"))
    sin_dec = math.sin(altitude) * math.sin(latitude) + (
        math.cos(altitude) * math.cos(latitude) * math.cos(azimuth)
    )
    where = at_hour_angle(row["expected"], math.asin(sin_dec), latitude)
    apart = separation_deg(
        where.azimuth_deg, where.altitude_deg, math.degrees(azimuth), math.degrees(altitude)
    )
    assert float(apart) < 1.0 / 3600.0, told(row, float(apart))


@pytest.mark.parametrize("row", rows("altaz.meeus13b."))
def test_venus_over_washington(row: Row) -> None:
    """Meeus gives the true equinox place; CIRS counts from another zero on the equator."""
    inputs = inputs_of(row)
    mjd = utc_mjd_of_ut1(inputs["ut1"])
    zero_rad = float(erfa.eo06a(MJD_ZERO, float(tt_mjd(mjd))))
    where = horizontal_of(
        np.array(Angle(inputs["ra"]).rad + zero_rad),
        np.array(Angle(inputs["dec"]).rad),
        np.array(mjd),
        site_of(inputs),
    )
    # He counts azimuth from the south.
    south_deg = float(where.azimuth_deg) - 180.0
    value = float(where.altitude_deg) if row["id"].endswith("alt") else south_deg
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("altaz.horizons."))
def test_a_direction_over_kitt_peak(row: Row) -> None:
    """The row's place is astrometric, in the axes of J2000.0."""
    inputs = inputs_of(row)
    mjd = mjd_from_iso(inputs["utc"])
    places = apparent_places(Angle(inputs["ra"]).deg, Angle(inputs["dec"]).deg, mjd)
    where = horizontal(places, mjd, site_of(inputs))
    value = float((where.altitude_deg if row["id"].endswith("alt") else where.azimuth_deg)[0, 0])
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("star.usno."))
def test_apparent_place_of_a_star(row: Row) -> None:
    """Deneb, from its Hipparcos place (from memory).

    The tabulated place counts right ascension from the equinox, and is topocentric: diurnal
    aberration moves it by 0.3 arcsec at most, which ours has in `horizontal`.
    """
    inputs = row["inputs"]
    mjd = utc_mjd_of_ut1(inputs["ut1"])
    places = apparent_places(
        Angle("20h41m25.915s").deg, Angle("+45d16m49.22s").deg, mjd,
        pm_ra_mas_per_yr=2.01, pm_dec_mas_per_yr=1.85,
    )  # fmt: skip
    zero_deg = math.degrees(float(erfa.eo06a(MJD_ZERO, float(tt_mjd(mjd)))))
    where = horizontal(places, mjd, site_of(inputs))
    shift_deg = math.degrees(DIURNAL_ABERRATION_RAD) * math.cos(math.radians(33.76))
    hour_angle_rad = math.radians(15.0 * float(where.hour_angle_h[0, 0]))
    dec_rad = math.radians(float(places.dec_deg[0]))
    ra_deg = places.ra_deg - zero_deg + shift_deg * math.cos(hour_angle_rad) / math.cos(dec_rad)
    dec_deg = places.dec_deg + shift_deg * math.sin(hour_angle_rad) * math.sin(dec_rad)
    apart_deg = separation_deg(
        ra_deg, dec_deg, Angle(inputs["ra"], unit="hourangle").deg, degrees(inputs["dec"])
    )
    value = 3600.0 * float(apart_deg[0])
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("sep."))
def test_angle_between_directions(row: Row) -> None:
    inputs = row["inputs"]
    if "al" in inputs:
        first = (math.degrees(inputs["al"]), math.degrees(inputs["ap"]))
        second = (math.degrees(inputs["bl"]), math.degrees(inputs["bp"]))
    else:
        first, second = direction(inputs["a"]), direction(inputs["b"])
    value = float(separation_deg(*first, *second))
    if row["unit"] == "rad":
        value = math.radians(value)
    assert agrees(row, value), told(row, value)


def direction(text: str) -> tuple[float, float]:
    """Return right ascension and declination (deg) written as two numbers or two angles."""
    ra, dec = text.split()
    if "h" in ra:
        return float(Angle(ra).deg), float(Angle(dec).deg)
    return float(ra), float(dec)
