"""How bright the sky is: airglow with altitude, moonlight, twilight, added as light.

Stated accuracy: moonlight 8 to 23 % in V (Krisciunas & Schaefer 1991), less sure in other bands;
twilight 0.2 mag at the zenith with the Sun 5 to 15 degrees down (Patat et al. 2006), a guide only
elsewhere; airglow itself varies by a third over a solar cycle (Krisciunas 1997). Moon and twilight
are on the scale of Vega magnitudes: filters in AB magnitudes are off by their offset, tenths of a
magnitude but for the ultraviolet.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, DTypeLike, NDArray

from engine.light.brightness import magnitude, nanolambert
from engine.light.moonlight import (
    MoonLight,
    ScatteringShares,
    gas_scattering,
    haze_scattering,
    lamp,
    scattering_path,
)
from engine.light.twilight import twilight_nanolambert
from engine.positions.air import STANDARD_PRESSURE_HPA

if TYPE_CHECKING:
    from engine.logbook import Filter

Floats = NDArray[np.floating]

MOONLIGHT_ACCURACY_PERCENT = (8.0, 23.0)
TWILIGHT_ACCURACY_MAG = 0.2

_LN_PER_MAG = 0.4 * math.log(10.0)


def sky_mags_arcsec2(
    filters: Sequence[Filter],
    *,
    altitude_deg: ArrayLike,
    sun_altitude_deg: ArrayLike,
    moon: MoonLight,
    pressure_hpa: float = STANDARD_PRESSURE_HPA,
    precision: DTypeLike = np.float64,
) -> Floats:
    """Return the sky (mag per square arcsecond) in filters: (F, *broadcast shape).

    ``altitude_deg`` is the target's: NaN below the horizon, and where an input is NaN. The dark sky
    goes with altitude as B X 10^(-0.4 k (X - 1)), eq. 2 of Krisciunas & Schaefer 1991 from memory.
    ``pressure_hpa`` says how much of the extinction is the gas's, which matters for the Moon away
    from V. With ``precision`` float32 good to 1e-5 mag, in less than half the time.
    """
    altitude = np.asarray(altitude_deg, dtype=precision)
    path = scattering_path(90.0 - np.maximum(altitude, 0.0))
    separation = np.asarray(moon.separation_deg, dtype=precision)
    gas, haze = gas_scattering(separation), haze_scattering(separation)
    below = np.where(altitude >= 0.0, 0.0, np.nan).astype(precision)
    skies = []
    for each in filters:
        k = each.extinction_mag
        shares = ScatteringShares.at(each.wavelength_nm, k, pressure_hpa)
        passed = np.exp(-_LN_PER_MAG * k * path)
        moonlight = lamp(moon, each.wavelength_nm, k).astype(precision)
        twilight = twilight_nanolambert(sun_altitude_deg, each.wavelength_nm).astype(precision)
        zenith = float(nanolambert(each.dark_sky_mag)) * 10.0 ** (0.4 * k)
        scattered = (shares.gas * gas + shares.haze * haze) * moonlight
        light = zenith * path * passed + scattered * (1.0 - passed) + twilight
        skies.append(magnitude(light) + below)
    return np.stack(skies)


def sky_mag_arcsec2(
    filter_: Filter,
    *,
    altitude_deg: ArrayLike,
    sun_altitude_deg: ArrayLike,
    moon: MoonLight,
    pressure_hpa: float = STANDARD_PRESSURE_HPA,
) -> NDArray[np.float64]:
    """Return the sky (mag per square arcsecond) in one filter: see `sky_mags_arcsec2`."""
    skies = sky_mags_arcsec2(
        (filter_,),
        altitude_deg=altitude_deg,
        sun_altitude_deg=sun_altitude_deg,
        moon=moon,
        pressure_hpa=pressure_hpa,
    )
    return np.asarray(skies[0], dtype=np.float64)
