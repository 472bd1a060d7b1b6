"""How bright the sky is: airglow with altitude, moonlight, twilight, added as light.

Stated accuracy: moonlight 8 to 23 % (Krisciunas & Schaefer 1991) in V, less sure in other bands;
twilight 0.2 mag at the zenith with the Sun 5 to 15 degrees down (Patat et al. 2006), a guide only
elsewhere; airglow itself varies by a third over a solar cycle (Krisciunas 1997).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
    from engine.logbook import Filter

Floats = NDArray[np.float64]

MOONLIGHT_ACCURACY_PERCENT = (8.0, 23.0)
TWILIGHT_ACCURACY_MAG = 0.2

V_WAVELENGTH_NM = 550.0
# Rayleigh scattering goes as the fourth power of frequency; haze as about its first and a third.
RAYLEIGH_POWER, HAZE_POWER = 4.0, 1.3
# Colour of moonlight against V by wavelength (nm): U-B 0.46, B-V 0.92 (Lane & Irvine 1973, AJ 78,
# 267), V-R 0.54 and V-I 1.00 for the Sun's colours reddened alike. From memory, not seen.
_MOON_COLOUR_NM = np.array([365.0, 438.0, 550.0, 641.0, 798.0, 1000.0])
_MOON_COLOUR_MAG = np.array([1.38, 0.92, 0.0, -0.54, -1.00, -1.25])

# Zenith twilight, mag/arcsec2 = a0 + a1 x + a2 x^2, x = Sun zenith distance - 95 deg (Patat,
# Ugolnikov & Postylyakov 2006, A&A 455, 385, Table 1), by wavelength (nm).
TWILIGHT_NM = np.array([365.0, 438.0, 550.0, 641.0, 798.0])
TWILIGHT_FIT = np.array(
    [
        [11.78, 1.376, -0.039],
        [11.84, 1.411, -0.041],
        [11.84, 1.518, -0.057],
        [11.40, 1.567, -0.064],
        [10.93, 1.470, -0.062],
    ]
)
# Past this the fit runs into the dark sky, which is added here by itself: go on at the measured
# mean slope (same table, V).
TWILIGHT_FIT_END_DEG = 103.0
TWILIGHT_SLOPE_MAG_PER_DEG = 1.14


@dataclass(frozen=True, slots=True)
class MoonLight:
    """The Moon as a lamp; arrays that broadcast. ``phase_angle_deg`` is 0 at full, 180 at new."""

    altitude_deg: ArrayLike
    separation_deg: ArrayLike
    phase_angle_deg: ArrayLike


def sky_mag_arcsec2(
    filter_: Filter, *, altitude_deg: ArrayLike, sun_altitude_deg: ArrayLike, moon: MoonLight
) -> Floats:
    """Return the sky (mag per square arcsecond) in a filter; arrays broadcast.

    NaN below the horizon. ``altitude_deg`` is the target's.
    """
    altitude = np.asarray(altitude_deg, dtype=float)
    above = altitude > 0.0
    zenith_deg = 90.0 - np.where(above, altitude, 90.0)
    path = scattering_path(zenith_deg)
    k = filter_.extinction_mag
    dark = nanolambert(filter_.dark_sky_mag) * path * 10.0 ** (-0.4 * k * (path - 1.0))
    light = (
        dark
        + moon_nanolambert(zenith_deg, moon, k, filter_.wavelength_nm)
        + nanolambert(twilight_mag_arcsec2(sun_altitude_deg, filter_.wavelength_nm))
    )
    return np.asarray(np.where(above, magnitude(light), np.nan))


def nanolambert(mag_arcsec2: ArrayLike) -> Floats:
    """Return brightness (nL) of a magnitude per square arcsecond (Garstang 1986, eq. 19).

    Made for V; in other bands it is a linear scale of that band's own, which is all adding needs.
    """
    return np.asarray(34.08 * np.exp(20.7233 - 0.92104 * np.asarray(mag_arcsec2, dtype=float)))


def magnitude(nanolamberts: ArrayLike) -> Floats:
    """Return the magnitude per square arcsecond of a brightness (nL)."""
    return np.asarray((20.7233 - np.log(np.asarray(nanolamberts, dtype=float) / 34.08)) / 0.92104)


def scattering_path(zenith_deg: ArrayLike) -> Floats:
    """Return the path length of light scattered in the air (1 at the zenith).

    X = (1 - 0.96 sin^2 Z)^-1/2 (Krisciunas & Schaefer 1991, eq. 3). Not an airmass for extinction
    of a star: at the horizon it is 5, where that is nearly 40.
    """
    sine = np.sin(np.deg2rad(np.asarray(zenith_deg, dtype=float)))
    return np.asarray((1.0 - 0.96 * sine**2) ** -0.5)


def moon_magnitude(phase_angle_deg: ArrayLike) -> Floats:
    """Return the Moon's V magnitude at a phase angle (deg) (Krisciunas & Schaefer 1991, eq. 9)."""
    angle = np.abs(np.asarray(phase_angle_deg, dtype=float))
    return np.asarray(-12.73 + 0.026 * angle + 4e-9 * angle**4)


def moon_scattering(separation_deg: ArrayLike, wavelength_nm: float = V_WAVELENGTH_NM) -> Floats:
    """Return the scattering function of moonlight at an angle (deg) from the Moon.

    f = 10^5.36 (1.06 + cos^2 rho) + 10^(6.15 - rho/40), and 6.2e7 / rho^2 for the second term
    closer than 10 deg (Krisciunas & Schaefer 1991, eqs. 16, 18, 19, 21; the branch from memory).
    The first term is the gas, the second the haze; away from V each is scaled by its power of the
    wavelength.
    """
    rho = np.asarray(separation_deg, dtype=float)
    shift = V_WAVELENGTH_NM / wavelength_nm
    gas = 10.0**5.36 * (1.06 + np.cos(np.deg2rad(rho)) ** 2)
    # Inside the disc (a quarter of a degree) the formula has no meaning; it is held there.
    near = 6.2e7 / np.maximum(rho, 0.25) ** 2
    haze = np.where(rho < 10.0, near, 10.0 ** (6.15 - rho / 40.0))
    return np.asarray(gas * shift**RAYLEIGH_POWER + haze * shift**HAZE_POWER)


def moon_nanolambert(
    zenith_deg: ArrayLike,
    moon: MoonLight,
    extinction_mag: float,
    wavelength_nm: float = V_WAVELENGTH_NM,
) -> Floats:
    """Return the brightness (nL) that the Moon adds; zero while it is down.

    Krisciunas & Schaefer 1991, PASP 103, 1033, eq. 15, with the Moon's own colour away from V.
    """
    moon_altitude = np.asarray(moon.altitude_deg, dtype=float)
    up = moon_altitude > 0.0
    colour = np.interp(wavelength_nm, _MOON_COLOUR_NM, _MOON_COLOUR_MAG)
    illuminance = 10.0 ** (-0.4 * (moon_magnitude(moon.phase_angle_deg) + colour + 16.57))
    to_moon = scattering_path(90.0 - np.where(up, moon_altitude, 90.0))
    dimmed = illuminance * 10.0 ** (-0.4 * extinction_mag * to_moon)
    scattered = 1.0 - 10.0 ** (-0.4 * extinction_mag * scattering_path(zenith_deg))
    light = moon_scattering(moon.separation_deg, wavelength_nm) * dimmed * scattered
    return np.asarray(np.where(up, light, 0.0))


def twilight_mag_arcsec2(sun_altitude_deg: ArrayLike, wavelength_nm: float) -> Floats:
    """Return the zenith twilight sky alone (mag per square arcsecond) at Sun altitudes (deg).

    Published between 5 and 15 degrees below the horizon; straight on at its slope outside, which is
    a guide only. With the Sun 20 degrees down nothing of it is left.
    """
    distance = 90.0 - np.asarray(sun_altitude_deg, dtype=float)
    a0, a1, a2 = (
        float(np.interp(wavelength_nm, TWILIGHT_NM, TWILIGHT_FIT[:, column])) for column in range(3)
    )
    x = np.clip(distance, 95.0, TWILIGHT_FIT_END_DEG) - 95.0
    fitted = a0 + a1 * x + a2 * x**2
    before = np.minimum(distance - 95.0, 0.0) * a1
    after = np.maximum(distance - TWILIGHT_FIT_END_DEG, 0.0) * TWILIGHT_SLOPE_MAG_PER_DEG
    return np.asarray(fitted + before + after)
