"""Twilight flats: how long to expose while the sky fades or brightens under the shutter.

The sky goes as exp(-q t) in the evening and exp(+q t) in the morning. A first flat's measured
level gives the rate at its start; the decline q comes from the Sun's speed, or better from two
measured levels.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.light.twilight import SLOPE_MAG_PER_DEG

Floats = NDArray[np.float64]


def decline_from_sun_per_s(
    sun_deg_per_min: ArrayLike, slope_mag_per_deg: float = SLOPE_MAG_PER_DEG
) -> Floats:
    """Return the decline q (per second) for a Sun that sinks so fast (deg per minute).

    1.14 mag per degree in V (Patat et al. 2006, Table 1). A rising Sun counts the same.
    """
    mag_per_s = np.abs(np.asarray(sun_deg_per_min, dtype=float)) / 60.0 * slope_mag_per_deg
    return np.asarray(0.4 * math.log(10.0) * mag_per_s)


def decline_measured_per_s(
    first_e_per_s: ArrayLike, second_e_per_s: ArrayLike, seconds_between: ArrayLike
) -> Floats:
    """Return the decline q (per second) from two rates measured some time (s) apart."""
    ratio = np.asarray(first_e_per_s, dtype=float) / np.asarray(second_e_per_s, dtype=float)
    return np.asarray(np.abs(np.log(ratio)) / np.asarray(seconds_between, dtype=float))


def halving_s(decline_per_s: ArrayLike) -> Floats:
    """Return in what time (s) the sky falls to half at a decline q (per second)."""
    return np.asarray(math.log(2.0) / np.asarray(decline_per_s, dtype=float))


def evening_flat_s(
    wanted_e: ArrayLike, start_e_per_s: ArrayLike, decline_per_s: ArrayLike
) -> Floats:
    """Return the exposure (s) that collects so many electrons from a fading sky; broadcast.

    t = -ln(1 - N q / S0) / q. NaN where it can't be had: all the light still to come, S0 / q, is
    no more than what is wanted.
    """
    q = np.asarray(decline_per_s, dtype=float)
    share = np.asarray(wanted_e, dtype=float) * q / np.asarray(start_e_per_s, dtype=float)
    possible = share < 1.0
    return np.asarray(np.where(possible, -np.log1p(-np.where(possible, share, 0.0)) / q, np.nan))


def morning_flat_s(
    wanted_e: ArrayLike, start_e_per_s: ArrayLike, decline_per_s: ArrayLike
) -> Floats:
    """Return the exposure (s) that collects so many electrons from a brightening sky.

    t = ln(1 + N q / S0) / q, arrays broadcast.
    """
    q = np.asarray(decline_per_s, dtype=float)
    share = np.asarray(wanted_e, dtype=float) * q / np.asarray(start_e_per_s, dtype=float)
    return np.asarray(np.log1p(share) / q)
