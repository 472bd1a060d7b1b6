"""Atmospheric refraction: from the geometric altitude to the one that is seen, and back.

Two models share the sky. High up, ERFA's two constants follow from the air itself and are exact to
a fraction of an arcsecond; near the horizon they fail, and Saemundsson's formula holds all the way
down. Between 5 and 10 degrees one hands over to the other.
"""

from __future__ import annotations

import erfa
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
# Saemundsson up to the first true altitude, ERFA from the second.
HANDOVER_DEG = (5.0, 10.0)
# Green light: where a star's refraction is meant when nobody says a colour.
WAVELENGTH_UM = 0.55


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


def constants_rad(air: Air, wavelength_um: float = WAVELENGTH_UM) -> tuple[float, float]:
    """Return ERFA's constants A and B (rad) for an air and a colour (refco).

    Refraction is then A tan z + B tan^3 z of the apparent zenith distance z.
    """
    a, b = erfa.refco(
        air.pressure_hpa, air.temperature_c, air.humidity_percent / 100.0, wavelength_um
    )
    return float(a), float(b)


def constants_refraction_deg(true_altitude_deg: ArrayLike, air: Air) -> Floats:
    """Return refraction (deg) of green light by ERFA's constants, at altitudes (deg) from 5 up.

    One Newton step leads from the true zenith distance to the apparent one (as in ERFA's atioq).
    0.3 % low at 10 deg, 4 % at 5.
    """
    a, b = constants_rad(air)
    tan_z = 1.0 / np.tan(np.deg2rad(np.asarray(true_altitude_deg, dtype=float)))
    square = tan_z * tan_z
    lift_rad = (a + b * square) * tan_z / (1.0 + (a + 3.0 * b * square) * (1.0 + square))
    return np.asarray(np.rad2deg(lift_rad))


def refraction_deg(true_altitude_deg: ArrayLike, air: Air) -> Floats:
    """Return refraction (deg, never negative) at a true altitude (deg, any shape, -90 to 90).

    ERFA's constants from 10 deg up, within 0.3 % of the Pulkovo tables; Saemundsson's formula,
    scaled to the air, up to 5 deg, within 3 % of them (an arcminute at the horizon); smoothly from
    one to the other between. Below -1 deg nothing is seen; the value there fades linearly to zero
    at -90. NaN stays NaN.
    """
    altitude_deg = np.asarray(true_altitude_deg, dtype=float)
    low_deg, high_deg = HANDOVER_DEG
    fade = np.clip((altitude_deg + 90.0) / (LOWEST_TRUE_DEG + 90.0), 0.0, 1.0)
    held_deg = np.clip(altitude_deg, LOWEST_TRUE_DEG, high_deg)
    lower_deg = saemundsson_arcmin(held_deg) * air_factor(air) / ARCMIN_PER_DEG * fade
    upper_deg = constants_refraction_deg(np.maximum(altitude_deg, low_deg), air)
    share = np.clip((altitude_deg - low_deg) / (high_deg - low_deg), 0.0, 1.0)
    share = share * share * (3.0 - 2.0 * share)
    return np.asarray(np.maximum(lower_deg + share * (upper_deg - lower_deg), 0.0))


def apparent_altitude_deg(true_altitude_deg: ArrayLike, air: Air) -> Floats:
    """Return the altitude that is seen (deg) for a geometric one (deg, any shape)."""
    altitude_deg = np.asarray(true_altitude_deg, dtype=float)
    return np.asarray(altitude_deg + refraction_deg(altitude_deg, air))


def true_altitude_deg(apparent_deg: ArrayLike, air: Air) -> Floats:
    """Return the geometric altitude (deg) of what is seen at an altitude (deg, any shape).

    The inverse of `apparent_altitude_deg`, by fixed-point steps: even in the coldest air refraction
    falls so slowly with altitude that each gains a factor of four. Ten leave 0.002 arcsec.
    """
    seen_deg = np.asarray(apparent_deg, dtype=float)
    altitude_deg = seen_deg
    for _ in range(10):
        altitude_deg = seen_deg - refraction_deg(altitude_deg, air)
    return altitude_deg
