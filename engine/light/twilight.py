"""The twilight sky at the zenith: Patat, Ugolnikov & Postylyakov 2006, A&A 455, 385, Table 1.

A polynomial in the Sun's zenith distance for U, B, V, R and I, measured with the Sun 5 to 15 deg
down to about 0.2 mag. Outside that, and away from the zenith, it is a guide only: towards the Sun
the twilight sky is brighter.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.light.brightness import nanolambert

Floats = NDArray[np.floating]

# mag/arcsec2 = a0 + a1 x + a2 x^2, x = Sun zenith distance - 95 deg, by wavelength (nm).
FIT_NM = np.array([365.0, 438.0, 550.0, 641.0, 798.0])
FIT = np.array(
    [
        [11.78, 1.376, -0.039],
        [11.84, 1.411, -0.041],
        [11.84, 1.518, -0.057],
        [11.40, 1.567, -0.064],
        [10.93, 1.470, -0.062],
    ]
)
# The fit's light is twilight and dark sky together: it flattens towards the dark sky of the same
# site (Patat 2003, A&A 400, 1183; V from memory), which is taken out here because it is added to
# twilight later.
FIT_DARK_MAG = np.array([22.3, 22.6, 21.6, 20.9, 19.7])
# Past this, too little of the fit is twilight; go on at the mean slope in V (same table).
FIT_BEGIN_DEG, FIT_END_DEG = 95.0, 103.0
SLOPE_MAG_PER_DEG = 1.14
NOTHING_LEFT_DEG = 108.0


def twilight_nanolambert(sun_altitude_deg: ArrayLike, wavelength_nm: float) -> Floats:
    """Return the zenith twilight alone (nL of the band) at Sun altitudes (deg, any shape).

    Between the published bands coefficients are interpolated. Extrapolated along its first slope
    to sunset, held while the Sun is up, and zero with the Sun 18 deg down or more.
    """
    distance = 90.0 - np.minimum(np.asarray(sun_altitude_deg, dtype=float), 0.0)
    beyond = np.clip(distance, FIT_END_DEG, NOTHING_LEFT_DEG) - FIT_END_DEG
    fade = 10.0 ** (-0.4 * SLOPE_MAG_PER_DEG * beyond)
    left = 10.0 ** (-0.4 * SLOPE_MAG_PER_DEG * (NOTHING_LEFT_DEG - FIT_END_DEG))
    light = _within_fit(np.minimum(distance, FIT_END_DEG), wavelength_nm) * (fade - left)
    return np.asarray(light / (1.0 - left))


def _within_fit(sun_zenith_distance_deg: Floats, wavelength_nm: float) -> Floats:
    """Return the fit without its dark sky (nL), straight on before its beginning."""
    a0, a1, a2 = (float(np.interp(wavelength_nm, FIT_NM, column)) for column in FIT.T)
    dark_mag = float(np.interp(wavelength_nm, FIT_NM, FIT_DARK_MAG))
    x = sun_zenith_distance_deg - FIT_BEGIN_DEG
    total_mag = a0 + a1 * x + a2 * np.maximum(x, 0.0) ** 2
    return np.asarray(nanolambert(total_mag) - nanolambert(dark_mag))
