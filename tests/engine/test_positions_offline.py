"""No network and an old table: everything works, without a warning, and the observer is told.

A fresh interpreter, because what is cached there would hide what is asked for here.
"""

from __future__ import annotations

import subprocess
import sys
import textwrap

import pytest

from engine.positions import earth_table_note
from engine.positions.earth import earth_table

A_YEAR_LATER_DAYS = 365.25

OFFLINE = """
import socket


def refuse(*args, **kwargs):
    raise AssertionError("something asked for the network")


class NoSocket(socket.socket):
    def __init__(self, *args, **kwargs):
        refuse()


socket.socket = NoSocket
socket.create_connection = refuse
socket.getaddrinfo = refuse

from datetime import timedelta

import numpy as np

from engine.logbook import Site
from engine.positions import (
    almanac, apparent_places, earth_table_note, horizontal, moon, prepare_astropy, sidereal_time_h,
    sun,
)
from engine.positions.earth import earth_table
from engine.times import datetime_from_mjd

mjd = earth_table().last_mjd + {later_days}
site = Site(
    name="Invented", latitude_deg=-33.2, longitude_deg=-70.6, elevation_m=2300.0,
    timezone="America/Santiago",
)
"""

OURS = """
found = almanac(site, datetime_from_mjd(mjd).date())
assert found.sunset is not None and found.sunrise is not None
places = apparent_places(np.array([10.0, 200.0]), np.array([-40.0, 5.0]), mjd)
minutes = mjd + np.arange(600.0) / 1440.0
for values in (
    horizontal(places, minutes, site).altitude_deg,
    moon(minutes, site).altitude_deg,
    moon(minutes, site).illumination,
    sun(minutes, site).altitude_deg,
    sidereal_time_h(minutes, site.longitude_deg),
):
    assert np.all(np.isfinite(values))
assert (earth_table_note(mjd) is not None) is (mjd > earth_table().last_mjd)
"""

ASTROPYS = """
prepare_astropy()
prepare_astropy()  # twice is harmless
import astropy.units as u
from astropy.utils import iers

# With a fresh table nothing would be fetched anyway: ask for the promise itself.
assert iers.conf.auto_download is False
from astropy.coordinates import AltAz, EarthLocation, SkyCoord, get_body
from astropy.time import Time

place = EarthLocation.from_geodetic(-70.6 * u.deg, -33.2 * u.deg, 2300.0 * u.m)
moment = Time(mjd, format="mjd", scale="utc")
theirs = SkyCoord(10.0 * u.deg, -40.0 * u.deg).transform_to(AltAz(obstime=moment, location=place))
ours = horizontal(apparent_places(10.0, -40.0, mjd), mjd, site)
apart_arcsec = 3600.0 * abs(theirs.alt.deg - float(ours.altitude_deg[0, 0]))
assert apart_arcsec < 20.0, apart_arcsec
assert np.isfinite(get_body("moon", moment, place).ra.deg)
"""


def run(program: str, later_days: float, *flags: str) -> None:
    """Run a program in a fresh interpreter, a time after the end of the table."""
    text = textwrap.dedent(OFFLINE.replace("{later_days}", repr(later_days)) + program)
    done = subprocess.run(
        [sys.executable, *flags, "-c", text], capture_output=True, text=True, timeout=60
    )
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""


@pytest.mark.parametrize("later_days", [-30.0, A_YEAR_LATER_DAYS, 10.0 * A_YEAR_LATER_DAYS])
def test_our_own_positions(later_days: float) -> None:
    run(OURS, later_days, "-W", "error")


@pytest.mark.parametrize("later_days", [-30.0, A_YEAR_LATER_DAYS, 10.0 * A_YEAR_LATER_DAYS])
def test_astropys_positions(later_days: float) -> None:
    """Astropy takes UT1 = UTC past the table, up to 0.9 s or 14 arcsec from the truth."""
    run(ASTROPYS, later_days, "-W", "error")


def test_no_note_while_the_table_reaches() -> None:
    assert earth_table_note(earth_table().last_mjd) is None


def test_the_note_names_a_day_and_an_error() -> None:
    last_mjd = earth_table().last_mjd
    note = earth_table_note(last_mjd + A_YEAR_LATER_DAYS)
    assert note is not None
    # 2.1 ms of time a day are 11.5 arcsec of hour angle after a year.
    assert "11.5 arcsec" in note
    assert "20" in note.split("ends on ")[1][:10], "a date in ISO form"
    sooner = earth_table_note(last_mjd + A_YEAR_LATER_DAYS / 10.0)
    assert sooner is not None
    assert "1.2 arcsec" in sooner


def test_the_error_stops_growing_where_leap_seconds_bound_it() -> None:
    """The value held is within 0.9 s of zero, and so is the true one: 27 arcsec at most."""
    last_mjd = earth_table().last_mjd
    late, later = (earth_table_note(last_mjd + years * 365.25) for years in (10.0, 50.0))
    assert late == later
    assert late is not None
    error_arcsec = float(late.split("up to ")[1].split(" arcsec")[0])
    assert 0.9 * 15.0 <= error_arcsec <= 1.8 * 15.0
