"""Sidereal time against worked examples and ERFA's own test values."""

from __future__ import annotations

import math
from datetime import datetime

import erfa
import pytest

from engine.positions import sidereal_time_h
from engine.positions.earth import MJD_ZERO, ut1_minus_utc_s
from engine.times import mjd_from_iso
from tests.published.rows import Row, agrees, rows, told

NOT_USED = {
    "sid.erfa.": "ERFA's own test at UT1 = TT: no UTC belongs to it, so our door can't be asked",
}

SECONDS_PER_DAY = 86400.0


def utc_mjd_of_ut1(ut1: str) -> float:
    """Return the UTC MJD of a UT1 moment."""
    ut1_mjd = mjd_from_iso(datetime.fromisoformat(ut1).isoformat())
    return ut1_mjd - float(ut1_minus_utc_s(ut1_mjd)) / SECONDS_PER_DAY


def mean_time_h(mjd: float, longitude_deg: float) -> float:
    """Return our apparent sidereal time less the equation of the equinoxes (ERFA ee06a)."""
    equation_h = math.degrees(float(erfa.ee06a(MJD_ZERO, mjd))) / 15.0
    return float(sidereal_time_h(mjd, longitude_deg)) - equation_h


@pytest.mark.parametrize("row", rows("sid.meeus12a.app"))
def test_apparent_time(row: Row) -> None:
    value = float(sidereal_time_h(utc_mjd_of_ut1(row["inputs"]["ut1"]), 0.0))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("sid.meeus12a.mean", "sid.meeus12b", "sid.idl.lmst"))
def test_mean_time(row: Row) -> None:
    """Mean times are of IAU 1982, 0.003 s from IAU 2006, which is inside the tolerances."""
    mjd = utc_mjd_of_ut1(row["inputs"]["ut1"])
    value = mean_time_h(mjd, row["inputs"].get("lon_east_deg", 0.0))
    assert agrees(row, value), told(row, value)
