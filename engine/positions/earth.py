"""The Earth's rotation: UT1, polar motion, sidereal time, from tables that came with the install.

astropy would fetch a newer table over the network and, past thirty days, refuse to work without
it. A console in a dome must do neither: `prepare_astropy` says so in one place, and
`earth_table_note` tells the observer what an old table can cost.
"""

from __future__ import annotations

import warnings
from collections.abc import Sequence
from dataclasses import dataclass
from functools import cache
from importlib.resources import files

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.times import datetime_from_mjd

Floats = NDArray[np.float64]

DEGREES_PER_HOUR = 15.0
MJD_ZERO = 2400000.5
RADIANS_PER_ARCSEC = np.deg2rad(1.0 / 3600.0)
TT_MINUS_TAI_S = 32.184
SECONDS_PER_DAY = 86400.0
# Before it UTC ran at a rate of its own.
FIRST_LEAP_SECOND_YEAR = 1972
# 1973 January 2, the first day of every finals2000A file.
FINALS_FIRST_MJD = 41684.0
# The fastest that UT1 has run away from a steady clock over a month or longer since 2000, by the
# table itself (March 2016: 2.05 ms a day; a test holds this against it).
UNKNOWN_UT1_S_PER_DAY = 0.0021
# Leap seconds keep UT1 - UTC within this (ITU-R TF.460-6).
LARGEST_UT1_MINUS_UTC_S = 0.9


def prepare_astropy() -> None:
    """Tell astropy never to use the network, and never to refuse or warn for want of a newer table.

    What it would say, `earth_table_note` says once and in plain words. Its own positions past the
    table's end take UT1 = UTC, up to 14 arcsec off. Calling this twice is harmless.
    """
    from astropy.utils import iers
    from astropy.utils.exceptions import AstropyWarning

    iers.conf.auto_download = False
    iers.conf.auto_max_age = None
    iers.conf.iers_degraded_accuracy = "ignore"
    for message, category in (
        ("Tried to get polar motions", AstropyWarning),
        (r".*dubious year", erfa.ErfaWarning),
    ):
        warnings.filterwarnings("ignore", message=message, category=category)


@dataclass(frozen=True, slots=True)
class EarthTable:
    """UT1 - UTC (s) and polar motion (rad) by day, measured and then predicted."""

    mjd: Floats
    ut1_minus_utc_s: Floats
    pole_x_rad: Floats
    pole_y_rad: Floats

    @property
    def last_mjd(self) -> float:
        """The last day it covers."""
        return float(self.mjd[-1])


@cache
def earth_table() -> EarthTable:
    """Return the bundled table (IERS Bulletin A and B, measured and then predicted values).

    Read here by its columns, because astropy's reader takes half a second and more, most of the
    time to the first screen; that reader is the way out should the file look strange. It also puts
    the C04 series in Bulletin B's place: half a millisecond apart at most since 2000, five before.
    """
    try:
        file = files("astropy_iers_data") / "data" / "finals2000A.all"
        return table_of_finals(file.read_text(encoding="ascii").splitlines())
    except (OSError, ValueError):
        return _table_by_astropy()


def table_of_finals(lines: Sequence[str]) -> EarthTable:
    """Return the table in the lines of a ``finals2000A`` file; ValueError when they are not one.

    Columns, counted from 1 (IERS, readme.finals2000A): 8-15 MJD; Bulletin A 19-27 pole x, 38-46
    pole y (arcsec), 59-68 UT1 - UTC (s); Bulletin B, better and later, 135-144, 145-154, 155-165.
    Days without a UT1 - UTC, at the end of the file, are left out.
    """
    days = [line for line in lines if line[58:68].strip()]
    if not days:
        raise ValueError("no line has a UT1 - UTC")
    mjd = np.array([line[7:15] for line in days], dtype=float)
    if mjd[0] != FINALS_FIRST_MJD or np.any(np.diff(mjd) != 1.0):
        raise ValueError("the days do not follow each other from the first one")
    return EarthTable(
        mjd=mjd,
        ut1_minus_utc_s=_column(days, slice(154, 165), slice(58, 68)),
        pole_x_rad=_column(days, slice(134, 144), slice(18, 27)) * RADIANS_PER_ARCSEC,
        pole_y_rad=_column(days, slice(144, 154), slice(37, 46)) * RADIANS_PER_ARCSEC,
    )


def _column(days: Sequence[str], bulletin_b: slice, bulletin_a: slice) -> Floats:
    """Return a column, from Bulletin B where it has come out and from A where not yet."""
    return np.array([day[bulletin_b].strip() or day[bulletin_a] for day in days], dtype=float)


def _table_by_astropy() -> EarthTable:
    prepare_astropy()
    from astropy.utils import iers

    table = iers.IERS_Auto.open()
    known = np.isfinite(np.asarray(table["UT1_UTC"].value, dtype=float))
    columns = {
        name: np.asarray(table[name].value, dtype=float)[known]
        for name in ("MJD", "UT1_UTC", "PM_x", "PM_y")
    }
    return EarthTable(
        mjd=columns["MJD"],
        ut1_minus_utc_s=columns["UT1_UTC"],
        pole_x_rad=np.nan_to_num(columns["PM_x"]) * RADIANS_PER_ARCSEC,
        pole_y_rad=np.nan_to_num(columns["PM_y"]) * RADIANS_PER_ARCSEC,
    )


def ut1_minus_utc_s(mjd: ArrayLike) -> Floats:
    """Return UT1 - UTC (s) at UTC MJDs of any shape.

    Interpolated between days, across a leap second without the step; held beyond either end of the
    table.
    """
    table, steps = earth_table(), _steps_s()
    when = np.asarray(mjd, dtype=float)
    smooth = np.interp(when, table.mjd, table.ut1_minus_utc_s - steps)
    place = np.clip(np.searchsorted(table.mjd, when, side="right") - 1, 0, len(steps) - 1)
    return np.asarray(smooth + steps[place])


@cache
def _steps_s() -> Floats:
    """Return the leap seconds since the table's first day, by day.

    Each is a step of one second in UT1 - UTC: what is interpolated is the smooth UT1 - TAI.
    """
    changes = np.diff(earth_table().ut1_minus_utc_s, prepend=earth_table().ut1_minus_utc_s[0])
    return np.asarray(np.cumsum(np.round(changes)))


def pole_rad(mjd: ArrayLike) -> tuple[Floats, Floats]:
    """Return the coordinates x, y of the pole (rad) at UTC MJDs; held beyond the table."""
    table = earth_table()
    when = np.asarray(mjd, dtype=float)
    return (
        np.asarray(np.interp(when, table.mjd, table.pole_x_rad)),
        np.asarray(np.interp(when, table.mjd, table.pole_y_rad)),
    )


def earth_table_note(mjd: float) -> str | None:
    """Return a plain sentence when the table does not reach a moment (UTC MJD); None when it does.

    The last value is held there. What that can cost grows by 2.1 ms of time a day, 0.03 arcsec of
    hour angle, until leap seconds bound it.
    """
    table = earth_table()
    if mjd <= table.last_mjd:
        return None
    error_s = min(
        UNKNOWN_UT1_S_PER_DAY * (mjd - table.last_mjd),
        LARGEST_UT1_MINUS_UTC_S + abs(float(table.ut1_minus_utc_s[-1])),
    )
    return (
        f"The Earth-rotation table ends on {datetime_from_mjd(table.last_mjd).date().isoformat()}: "
        f"hour angles may be off by up to {error_s * DEGREES_PER_HOUR:.1f} arcsec. "
        "That is nothing for pointing; install a newer astropy-iers-data when convenient."
    )


@cache
def leap_seconds() -> tuple[Floats, Floats]:
    """Return the days (MJD) at which TAI - UTC (s) took a new value, and the values; from 1972 on.

    ERFA's own table. Its conversions are not used: they warn of any year five past the table's.
    """
    table = erfa.leap_seconds.get()
    whole = table[table["year"] >= FIRST_LEAP_SECOND_YEAR]
    _, days_mjd = erfa.cal2jd(whole["year"], whole["month"], 1)
    return np.asarray(days_mjd), np.asarray(whole["tai_utc"])


def tt_mjd(mjd: ArrayLike) -> Floats:
    """Return Terrestrial Time as MJD for UTC MJDs of any shape.

    TAI - UTC is held at its first value before 1972 and at its last after the table's end.
    """
    when = np.asarray(mjd, dtype=float)
    days_mjd, tai_minus_utc_s = leap_seconds()
    place = np.clip(np.searchsorted(days_mjd, when, side="right") - 1, 0, len(days_mjd) - 1)
    return np.asarray(when + (tai_minus_utc_s[place] + TT_MINUS_TAI_S) / SECONDS_PER_DAY)


def ut1_mjd(mjd: ArrayLike) -> Floats:
    """Return UT1 as MJD for UTC MJDs of any shape."""
    when = np.asarray(mjd, dtype=float)
    return np.asarray(when + ut1_minus_utc_s(when) / SECONDS_PER_DAY)


def rotation_angle_rad(mjd: ArrayLike) -> Floats:
    """Return the Earth rotation angle (rad) at UTC MJDs of any shape (IAU 2000, ERFA era00)."""
    return np.asarray(erfa.era00(MJD_ZERO, ut1_mjd(mjd)))


def sidereal_time_h(mjd: ArrayLike, longitude_deg: float) -> Floats:
    """Return the apparent local sidereal time (h, 0 to 24) at UTC MJDs of any shape.

    Greenwich apparent sidereal time (IAU 2006/2000A, ERFA gst06a) plus the east longitude (deg).
    """
    greenwich = erfa.gst06a(MJD_ZERO, ut1_mjd(mjd), MJD_ZERO, tt_mjd(mjd))
    hours = np.rad2deg(greenwich) / DEGREES_PER_HOUR + longitude_deg / DEGREES_PER_HOUR
    return np.asarray(np.mod(hours, 24.0))
