"""How much a star's light flickers in an exposure, as a fraction of it (rms)."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

Floats = NDArray[np.float64]

# Osborn et al. 2015, MNRAS 452, 1707: the measured factor on Young's formula is about 1.5 where a
# site's own is not known (the advice from memory).
C_Y = 1.5
# Height over which the turbulence that matters thins out, in both formulas.
SCALE_HEIGHT_M = 8000.0


def scintillation_rms(
    aperture_m: ArrayLike,
    airmass: ArrayLike,
    seconds: ArrayLike,
    elevation_m: float,
    *,
    c_y: float = C_Y,
) -> Floats:
    """Return the rms flicker (fraction) in so many seconds (s); arrays broadcast.

    The formula of Osborn et al. 2015, eq. 7, is the *variance*, and this is its root:
    10e-6 C_Y^2 D^(-4/3) t^-1 X^3 exp(-2 h / 8000). Good for exposures much longer than the
    aperture's crossing time (tens of milliseconds).
    """
    variance = (
        10e-6
        * c_y**2
        * np.asarray(aperture_m, dtype=float) ** (-4.0 / 3.0)
        / np.asarray(seconds, dtype=float)
        * np.asarray(airmass, dtype=float) ** 3
        * np.exp(-2.0 * elevation_m / SCALE_HEIGHT_M)
    )
    return np.asarray(np.sqrt(variance))


def scintillation_rms_young(
    aperture_m: ArrayLike, airmass: ArrayLike, seconds: ArrayLike, elevation_m: float
) -> Floats:
    """Return the rms flicker (fraction) by the classical formula, a third less than the other.

    0.09 D^(-2/3) X^1.75 exp(-h / 8000) / sqrt(2 t), D in cm (Young 1967, AJ 72, 747; Dravins et
    al. 1998, PASP 110, 610, eq. 10).
    """
    aperture_cm = 100.0 * np.asarray(aperture_m, dtype=float)
    return np.asarray(
        0.09
        * aperture_cm ** (-2.0 / 3.0)
        * np.asarray(airmass, dtype=float) ** 1.75
        * np.exp(-elevation_m / SCALE_HEIGHT_M)
        / np.sqrt(2.0 * np.asarray(seconds, dtype=float))
    )
