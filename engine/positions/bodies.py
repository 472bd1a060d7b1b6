"""The Sun and the Moon, as seen from the site."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import erfa
import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.positions.earth import MJD_ZERO, rotation_angle_rad, tt_mjd
from engine.positions.stars import Horizontal, horizontal_of, local_axes

if TYPE_CHECKING:
    from engine.logbook import Site

Floats = NDArray[np.float64]

AU_KM = 149597870.7
LIGHT_KM_PER_DAY = 299792.458 * 86400.0
# WGS84 (NIMA TR8350.2, 2000).
EARTH_RADIUS_KM = 6378.137
EARTH_FLATTENING = 1.0 / 298.257223563
ONE_NIGHT_DAYS = 1.5


@dataclass(frozen=True, slots=True)
class Body(Horizontal):
    """A body of the Solar System at T moments: topocentric, apparent.

    ``ra_deg``, ``dec_deg`` in the CIRS of date, like those of the stars; ``distance_km`` from the
    site.
    """

    ra_deg: Floats
    dec_deg: Floats
    distance_km: Floats


@dataclass(frozen=True, slots=True)
class Moon(Body):
    """The Moon: also its lit share (0 to 1) and phase angle (deg, 0 at full), from the site."""

    illumination: Floats
    phase_angle_deg: Floats


def sun(mjd: ArrayLike, site: Site) -> Body:
    """Return the Sun at T moments (UTC MJD); good to a few hundredths of an arcsecond.

    Earth from the VSOP-based series of ERFA (epv00), with aberration.
    """
    when = np.atleast_1d(np.asarray(mjd, dtype=float))
    heliocentric, barycentric = erfa.epv00(MJD_ZERO, tt_mjd(when))
    away_km = -np.asarray(heliocentric["p"]) * AU_KM
    aberrated = _aberrated(away_km, np.asarray(barycentric["v"]))
    return Body(**_topocentric(aberrated, when, site))


def moon(mjd: ArrayLike, site: Site) -> Moon:
    """Return the Moon at T moments (UTC MJD); good to about 10 arcsec.

    The series of Meeus (Astronomical Algorithms ch. 47, ERFA moon98), which is all of the error. It
    is seen where it was a light-time ago, 0.7 arcsec back on its way around us; the motion of the
    Earth itself drops out, because the Moon shares it.
    """
    when = np.atleast_1d(np.asarray(mjd, dtype=float))
    tt = tt_mjd(when)
    away_km = _light_time_ago(erfa.moon98(MJD_ZERO, tt))
    seen = _topocentric(away_km, when, site)
    heliocentric, _ = erfa.epv00(MJD_ZERO, tt)
    to_sun_km = -np.asarray(heliocentric["p"]) * AU_KM
    site_km = erfa.trxp(_cirs_matrix(when), _site_cirs_km(when, site))
    phase_deg = phase_angle_deg(away_km, to_sun_km, site_km)
    return Moon(**seen, illumination=lit_share(phase_deg), phase_angle_deg=phase_deg)


def phase_angle_deg(to_moon_km: Floats, to_sun_km: Floats, to_site_km: Floats) -> Floats:
    """Return the angle (deg) at the Moon between the Sun and the site (Meeus ch. 48).

    Vectors (..., 3) from the Earth's centre.
    """
    angle_rad = erfa.sepp(to_sun_km - to_moon_km, to_site_km - to_moon_km)
    return np.asarray(np.rad2deg(angle_rad))


def lit_share(phase_deg: ArrayLike) -> Floats:
    """Return the lit share (0 to 1) of a disc at phase angles (deg): (1 + cos i) / 2."""
    return np.asarray((1.0 + np.cos(np.deg2rad(phase_deg))) / 2.0)


def _light_time_ago(now: NDArray[np.void]) -> Floats:
    """Return where (T, 3; km) a body was when the light left that arrives now.

    From its geocentric places and velocities (au, au/day): one step back along a straight line.
    """
    away_km = np.asarray(now["p"]) * AU_KM
    days = np.linalg.norm(away_km, axis=-1, keepdims=True) / LIGHT_KM_PER_DAY
    return np.asarray(away_km - np.asarray(now["v"]) * AU_KM * days)


def _aberrated(away_km: Floats, velocity_au_per_day: Floats) -> Floats:
    """Return directions (T, 3) as seen from an Earth that moves: the classical first order."""
    distance_km = np.linalg.norm(away_km, axis=-1, keepdims=True)
    speed = velocity_au_per_day * AU_KM / LIGHT_KM_PER_DAY
    return np.asarray(away_km + distance_km * speed)


def _cirs_matrix(mjd: Floats) -> Floats:
    """Return the GCRS to CIRS matrices of T moments (IAU 2006/2000A, ERFA c2i06a).

    Over one night the axes move by less than 0.1 arcsec: one matrix then serves all its minutes.
    """
    when = tt_mjd(np.mean(mjd) if np.ptp(mjd) < ONE_NIGHT_DAYS else mjd)
    return np.asarray(erfa.c2i06a(MJD_ZERO, when))


def _site_cirs_km(mjd: Floats, site: Site) -> Floats:
    axes = local_axes(mjd, site)
    sin_p, cos_p = np.sin(axes.latitude_rad), np.cos(axes.latitude_rad)
    flat = (1.0 - EARTH_FLATTENING) ** 2
    curve = EARTH_RADIUS_KM / np.sqrt(cos_p**2 + flat * sin_p**2)
    height_km = site.elevation_m / 1000.0
    turn = rotation_angle_rad(mjd) + axes.longitude_rad
    across = (curve + height_km) * cos_p
    return np.stack(
        [
            across * np.cos(turn),
            across * np.sin(turn),
            np.full_like(turn, (flat * curve + height_km) * sin_p),
        ],
        axis=-1,
    )


def _topocentric(geocentric_km: Floats, mjd: Floats, site: Site) -> dict[str, Floats]:
    seen_km = erfa.rxp(_cirs_matrix(mjd), geocentric_km) - _site_cirs_km(mjd, site)
    ra_rad, dec_rad = erfa.c2s(seen_km)
    where = horizontal_of(np.asarray(ra_rad), np.asarray(dec_rad), mjd, site)
    return {
        "hour_angle_h": where.hour_angle_h,
        "altitude_deg": where.altitude_deg,
        "azimuth_deg": where.azimuth_deg,
        "parallactic_angle_deg": where.parallactic_angle_deg,
        "ra_deg": np.mod(np.rad2deg(ra_rad), 360.0),
        "dec_deg": np.asarray(np.rad2deg(dec_rad)),
        "distance_km": np.linalg.norm(seen_km, axis=-1),
    }
