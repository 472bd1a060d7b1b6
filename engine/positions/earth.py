"""The Earth's rotation: UT1, polar motion, sidereal time, from tables that came with the install.

astropy would fetch a newer table over the network and, past thirty days, refuse to work without
it. A console in a dome must do neither: `prepare_astropy` says so in one place, and
`earth_table_note` tells the observer what an old table can cost.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cache

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.times import datetime_from_mjd

Floats = NDArray[np.float64]

DEGREES_PER_HOUR = 15.0
MJD_ZERO = 2400000.5
TT_MINUS_TAI_S = 32.184
SECONDS_PER_DAY = 86400.0
# UT1 drifts against UTC by up to about a millisecond a day when nobody predicts it: the scatter of
# the length of day since 1990 (IERS C04; from memory). One second of time is 15 arcsec.
UNKNOWN_UT1_S_PER_DAY = 0.001


@cache
def prepare_astropy() -> None:
    """Tell astropy never to use the network and never to refuse for want of a newer table."""
    from astropy.utils import iers

    iers.conf.auto_download = False
    iers.conf.auto_max_age = None
    iers.conf.iers_degraded_accuracy = "warn"


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
    """Return the bundled table (IERS Bulletin A, final and predicted values)."""
    prepare_astropy()
    from astropy.utils import iers

    table = iers.IERS_Auto.open()
    arcsec = np.deg2rad(1.0 / 3600.0)
    known = np.isfinite(np.asarray(table["UT1_UTC"].value, dtype=float))
    columns = {
        name: np.asarray(table[name].value, dtype=float)[known]
        for name in ("MJD", "UT1_UTC", "PM_x", "PM_y")
    }
    return EarthTable(
        mjd=columns["MJD"],
        ut1_minus_utc_s=columns["UT1_UTC"],
        pole_x_rad=np.nan_to_num(columns["PM_x"]) * arcsec,
        pole_y_rad=np.nan_to_num(columns["PM_y"]) * arcsec,
    )


def ut1_minus_utc_s(mjd: ArrayLike) -> Floats:
    """Return UT1 - UTC (s) at UTC MJDs of any shape.

    Interpolated between days, across a leap second without the step; held beyond either end of the
    table.
    """
    table = earth_table()
    # A leap second is a step of one second in UT1 - UTC: interpolate the smooth UT1 - TAI.
    steps = np.cumsum(np.concatenate(([0.0], np.round(np.diff(table.ut1_minus_utc_s)))))
    when = np.asarray(mjd, dtype=float)
    smooth = np.interp(when, table.mjd, table.ut1_minus_utc_s - steps)
    place = np.clip(np.searchsorted(table.mjd, when, side="right") - 1, 0, len(steps) - 1)
    return np.asarray(smooth + steps[place])


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

    The error it can cause grows by about a millisecond of time a day, 0.015 arcsec of hour angle.
    """
    last_mjd = earth_table().last_mjd
    if mjd <= last_mjd:
        return None
    error_s = UNKNOWN_UT1_S_PER_DAY * (mjd - last_mjd)
    return (
        f"The Earth-rotation table ends on {datetime_from_mjd(last_mjd).date().isoformat()}: "
        f"hour angles may be off by up to {error_s * DEGREES_PER_HOUR:.1f} arcsec. "
        "That is nothing for pointing; install a newer astropy-iers-data when convenient."
    )


def tt_mjd(mjd: ArrayLike) -> Floats:
    """Return Terrestrial Time as MJD for UTC MJDs of any shape (leap seconds from ERFA)."""
    when = np.asarray(mjd, dtype=float)
    tai_1, tai_2 = erfa.utctai(MJD_ZERO, when)
    return np.asarray((tai_1 - MJD_ZERO) + tai_2 + TT_MINUS_TAI_S / SECONDS_PER_DAY)


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
