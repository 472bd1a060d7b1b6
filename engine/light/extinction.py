"""What the air takes: the share of extinction that the gas itself must cause."""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.positions.air import STANDARD_PRESSURE_HPA

MAGNITUDES_PER_OPTICAL_DEPTH = 2.5 / math.log(10.0)


def rayleigh_mag(
    wavelength_nm: ArrayLike, pressure_hpa: float = STANDARD_PRESSURE_HPA
) -> NDArray[np.float64]:
    """Return Rayleigh extinction (mag per airmass) at a wavelength (nm) under a pressure (hPa).

    Bodhaine et al. 1999, JAOT 16, 1854, eq. 30 (from memory), in proportion to the pressure. Haze
    and ozone come on top, so no clean sky extinguishes less.
    """
    square_um2 = (np.asarray(wavelength_nm, dtype=float) * 1e-3) ** 2
    depth = (
        0.0021520
        * (1.0455996 - 341.29061 / square_um2 - 0.90230850 * square_um2)
        / (1.0 + 0.0027059889 / square_um2 - 85.968563 * square_um2)
    )
    return np.asarray(MAGNITUDES_PER_OPTICAL_DEPTH * depth * pressure_hpa / STANDARD_PRESSURE_HPA)
