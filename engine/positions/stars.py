"""Where the stars are: the apparent place once a night, then plain trigonometry.

The apparent place of a star (proper motion, light deflection, annual aberration, precession,
nutation) changes by a few tenths of an arcsecond in a night; the turning of the Earth is all the
rest. So ERFA works out the place once, for mid-night, and the night itself is vectorised
trigonometry: within 0.2 arcsec of a full transformation at each minute, and several times cheaper
(``python -m tests.bench.positions``).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.positions.earth import DEGREES_PER_HOUR, MJD_ZERO, pole_rad, rotation_angle_rad, tt_mjd

if TYPE_CHECKING:
    from engine.logbook import Site

Floats = NDArray[np.float64]

J2000_YR = 2000.0
MILLIARCSEC_RAD = np.deg2rad(1.0 / 3600.0e3)
# Speed of the Earth's surface at the equator over the speed of light: 465.1 m/s / c.
DIURNAL_ABERRATION_RAD = 465.101 / 299792458.0


@dataclass(frozen=True, slots=True)
class Places:
    """Apparent places of N targets: right ascension and declination (deg) in the CIRS of date."""

    ra_deg: Floats
    dec_deg: Floats

    def only(self, index: int) -> Places:
        """Return the place of one of them, still as arrays (1,)."""
        return Places(self.ra_deg[index : index + 1], self.dec_deg[index : index + 1])


@dataclass(frozen=True, slots=True)
class Horizontal:
    """Where things stand over the site; every array has one shape.

    ``altitude_deg`` is geometric: refraction is not in it. ``azimuth_deg`` runs from north through
    east, 0 to 360; ``hour_angle_h`` from -12 to 12, west positive; ``parallactic_angle_deg`` from
    -180 to 180, positive west of the meridian.
    """

    hour_angle_h: Floats
    altitude_deg: Floats
    azimuth_deg: Floats
    parallactic_angle_deg: Floats


def apparent_places(
    ra_deg: ArrayLike,
    dec_deg: ArrayLike,
    mjd: float,
    *,
    pm_ra_mas_per_yr: ArrayLike = 0.0,
    pm_dec_mas_per_yr: ArrayLike = 0.0,
    epoch_yr: ArrayLike = J2000_YR,
) -> Places:
    """Return the apparent places (N,) of stars on the night around a moment (UTC MJD).

    ICRS coordinates in degrees at their epoch (Julian years); proper motions in mas a year, that in
    right ascension with cos(dec). Parallax is left out: under 0.8 arcsec for every star. ERFA
    apci13 once (the Earth's part), then atciq for each star.
    """
    dec = np.atleast_1d(np.deg2rad(np.asarray(dec_deg, dtype=float)))
    ra = np.atleast_1d(np.deg2rad(np.asarray(ra_deg, dtype=float)))
    cos_dec = np.maximum(np.cos(dec), 1e-12)
    rate_ra = np.asarray(pm_ra_mas_per_yr, dtype=float) * MILLIARCSEC_RAD / cos_dec
    rate_dec = np.asarray(pm_dec_mas_per_yr, dtype=float) * MILLIARCSEC_RAD
    # ERFA moves the star on from J2000.0; bring it there from its own epoch first.
    years = J2000_YR - np.asarray(epoch_yr, dtype=float)
    astrometry, _ = erfa.apci13(MJD_ZERO, float(tt_mjd(mjd)))
    with np.errstate(invalid="ignore"):  # a NaN direction has a NaN place, and says no more
        cirs_ra, cirs_dec = erfa.atciq(
            ra + rate_ra * years, dec + rate_dec * years, rate_ra, rate_dec, 0.0, 0.0, astrometry
        )
    return Places(np.mod(np.rad2deg(cirs_ra), 360.0), np.rad2deg(cirs_dec))


def horizontal(places: Places, mjd: ArrayLike, site: Site) -> Horizontal:
    """Return where N targets stand (N, T) at T moments (UTC MJD) over a site.

    Within 0.2 arcsec of astropy's AltAz without refraction for the night the places were made for,
    at every latitude. Polar motion is in; diurnal aberration (at most 0.32 arcsec) is in.
    """
    moments = np.atleast_1d(np.asarray(mjd, dtype=float))
    return horizontal_of(
        np.deg2rad(places.ra_deg)[:, None], np.deg2rad(places.dec_deg)[:, None], moments, site
    )


def horizontal_of(ra_rad: Floats, dec_rad: Floats, mjd: Floats, site: Site) -> Horizontal:
    """Return where CIRS directions (rad) stand over a site; shapes broadcast against ``mjd``.

    The usual rotation through hour angle and latitude (Green 1985, Spherical Astronomy, ch. 2).
    """
    axes = local_axes(mjd, site)
    turn = rotation_angle_rad(mjd) + axes.longitude_rad
    sin_a, cos_a = np.sin(ra_rad), np.cos(ra_rad)
    sin_d, cos_d = np.sin(dec_rad), np.cos(dec_rad)
    sin_p, cos_p = np.sin(axes.latitude_rad), np.cos(axes.latitude_rad)
    # With h = t - a, sin h and cos h are sums of sin t and cos t with factors of the target alone.
    # The observer moves to the east, and the sky leans that way.
    east = _turning(turn, cos_d * sin_a, -cos_d * cos_a, DIURNAL_ABERRATION_RAD * cos_p)
    north = _turning(turn, -sin_p * cos_d * cos_a, -sin_p * cos_d * sin_a, sin_d * cos_p)
    up = _turning(turn, cos_p * cos_d * cos_a, cos_p * cos_d * sin_a, sin_d * sin_p)
    to_west = _turning(turn, -cos_p * sin_a, cos_p * cos_a, 0.0)
    to_pole = _turning(turn, -cos_p * sin_d * cos_a, -cos_p * sin_d * sin_a, sin_p * cos_d)
    hours = np.rad2deg(turn) / DEGREES_PER_HOUR - np.rad2deg(ra_rad) / DEGREES_PER_HOUR
    return Horizontal(
        hour_angle_h=_folded(hours + 12.0, 24.0) - 12.0,
        altitude_deg=np.rad2deg(np.arctan2(up, np.sqrt(east * east + north * north))),
        azimuth_deg=_folded(np.rad2deg(np.arctan2(east, north) - axes.north_rad), 360.0),
        parallactic_angle_deg=np.rad2deg(np.arctan2(to_west, to_pole)),
    )


def _turning(
    turn_rad: Floats, with_cos: Floats, with_sin: Floats, constant: Floats | float
) -> Floats:
    """Return with_cos x cos(turn) + with_sin x sin(turn) + constant; shapes broadcast.

    In place, because large arrays cost more to fetch from the system than to fill.
    """
    total = np.asarray(with_cos * np.cos(turn_rad))
    total += with_sin * np.sin(turn_rad)
    total += constant
    return total


def _folded(values: Floats, full: float) -> Floats:
    """Return values modulo a full turn; a tenth of the time of ``np.mod``."""
    return np.asarray(values - full * np.floor(values / full))


@dataclass(frozen=True, slots=True)
class LocalAxes:
    """A site's zenith against the Earth's axis, and the azimuth of its north on the map (rad)."""

    longitude_rad: float
    latitude_rad: float
    north_rad: float


def local_axes(mjd: ArrayLike, site: Site) -> LocalAxes:
    """Return a site's axes on the night around moments (UTC MJD).

    Polar motion (ERFA pom00) moves the zenith by at most half an arcsecond; north on the map is
    then not quite where the axis is. Exact at the poles too.
    """
    longitude, latitude = np.deg2rad(site.longitude_deg), np.deg2rad(site.latitude_deg)
    x, y = pole_rad(float(np.mean(np.asarray(mjd, dtype=float))))
    to_axis = erfa.pom00(x, y, 0.0).T
    zenith = to_axis @ erfa.s2c(longitude, latitude)
    north = to_axis @ erfa.s2c(longitude, latitude + np.pi / 2.0)
    moved_longitude, moved_latitude = erfa.c2s(zenith)
    due_north = erfa.s2c(moved_longitude, moved_latitude + np.pi / 2.0)
    due_east = erfa.s2c(moved_longitude + np.pi / 2.0, 0.0)
    return LocalAxes(
        float(moved_longitude),
        float(moved_latitude),
        float(np.arctan2(north @ due_east, north @ due_north)),
    )


def separation_deg(
    ra_1_deg: ArrayLike, dec_1_deg: ArrayLike, ra_2_deg: ArrayLike, dec_2_deg: ArrayLike
) -> Floats:
    """Return the angle (deg) between directions (ERFA seps); shapes broadcast."""
    angles = (
        np.deg2rad(np.asarray(a, dtype=float)) for a in (ra_1_deg, dec_1_deg, ra_2_deg, dec_2_deg)
    )
    return np.asarray(np.rad2deg(erfa.seps(*angles)))
