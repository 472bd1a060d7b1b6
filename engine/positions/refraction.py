"""Atmospheric refraction: from the geometric altitude to the one that is seen, and back."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.positions.air import Air

Floats = NDArray[np.float64]

ARCMIN_PER_DEG = 60.0
# The formulas were fitted for this air.
FITTED_PRESSURE_HPA = 1010.0
FITTED_TEMPERATURE_C = 10.0
# Below this the formulas were never meant to hold; refraction is faded to nothing at the nadir so
# that the apparent altitude stays a rising function of the true one.
LOWEST_TRUE_DEG = -1.0


def saemundsson_arcmin(true_altitude_deg: ArrayLike) -> Floats:
    """Return refraction (arcmin) at a true altitude (deg), for 1010 hPa and 10 deg C.

    R = 1.02 / tan(h + 10.3 / (h + 5.11)), h in degrees (Saemundsson 1986, Sky & Telescope 72, 70).
    It goes to -0.0019 arcmin at the zenith.
    """
    h = np.asarray(true_altitude_deg, dtype=float)
    return np.asarray(1.02 / np.tan(np.deg2rad(h + 10.3 / (h + 5.11))))


def bennett_arcmin(apparent_altitude_deg: ArrayLike) -> Floats:
    """Return refraction (arcmin) at an apparent altitude (deg), for 1010 hPa and 10 deg C.

    R = 1 / tan(h + 7.31 / (h + 4.4)), h in degrees (Bennett 1982, Journal of Navigation 35, 255);
    good to 0.07 arcmin.
    """
    h = np.asarray(apparent_altitude_deg, dtype=float)
    return np.asarray(1.0 / np.tan(np.deg2rad(h + 7.31 / (h + 4.4))))


def bennett_improved_arcmin(apparent_altitude_deg: ArrayLike) -> Floats:
    """Return Bennett's refraction (arcmin) with his correction, good to 0.015 arcmin.

    R - 0.06 sin(14.7 R + 13), the argument in degrees (Meeus, Astronomical Algorithms, p. 106).
    """
    plain = bennett_arcmin(apparent_altitude_deg)
    return np.asarray(plain - 0.06 * np.sin(np.deg2rad(14.7 * plain + 13.0)))


def air_factor(air: Air) -> float:
    """Return how much more an air refracts than the fitted one: (P / 1010) (283 / (273 + T))."""
    return (air.pressure_hpa / FITTED_PRESSURE_HPA) * (
        (273.0 + FITTED_TEMPERATURE_C) / (273.0 + air.temperature_c)
    )


def refraction_deg(true_altitude_deg: ArrayLike, air: Air) -> Floats:
    """Return refraction (deg, never negative) at a true altitude (deg, any shape, -90 to 90).

    Saemundsson's formula scaled to the air. Below -1 deg nothing is seen; the value there fades
    linearly to zero at -90. NaN stays NaN. Up to 3.5 % more than the Pulkovo tables give (10 arcsec
    at 10 deg, an arcminute at the horizon): nothing to an airmass or a limit.
    """
    altitude_deg = np.asarray(true_altitude_deg, dtype=float)
    held_deg = np.maximum(altitude_deg, LOWEST_TRUE_DEG)
    fade = np.clip((altitude_deg + 90.0) / (LOWEST_TRUE_DEG + 90.0), 0.0, 1.0)
    arcmin = np.maximum(saemundsson_arcmin(held_deg), 0.0) * air_factor(air)
    return np.asarray(arcmin * fade / ARCMIN_PER_DEG)


def apparent_altitude_deg(true_altitude_deg: ArrayLike, air: Air) -> Floats:
    """Return the altitude that is seen (deg) for a geometric one (deg, any shape)."""
    altitude_deg = np.asarray(true_altitude_deg, dtype=float)
    return np.asarray(altitude_deg + refraction_deg(altitude_deg, air))


def true_altitude_deg(apparent_deg: ArrayLike, air: Air) -> Floats:
    """Return the geometric altitude (deg) of what is seen at an altitude (deg, any shape).

    The inverse of `apparent_altitude_deg`, by fixed-point steps: refraction falls so slowly with
    altitude that each step gains a factor of four or more.
    """
    seen_deg = np.asarray(apparent_deg, dtype=float)
    altitude_deg = seen_deg
    for _ in range(24):
        altitude_deg = seen_deg - refraction_deg(altitude_deg, air)
    return altitude_deg
