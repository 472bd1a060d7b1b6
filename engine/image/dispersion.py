"""Differential refraction: how far apart the air sets the colours of one star.

The index of moist air follows Filippenko 1982 (PASP 94, 715, eqs. 1 to 3: Edlen 1953 and Coleman,
Bozman & Meggers 1960, with Barrell's pressure, temperature and vapour terms), and the shift its
plane-parallel eq. 4, ΔR = (n₁ - n₂) tan z. His own example, 8 mmHg of vapour at 7 deg C, is 106 %
relative humidity: nothing here refuses a humidity.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.logbook.observatory import ARCSEC_PER_RADIAN, Filter
from engine.positions.air import Air

HPA_PER_MMHG = 1013.25 / 760.0

SHORTEST_NM = 300.0
"""No starlight comes through shorter than this: ozone (common knowledge, no source)."""


def vapour_pressure_hpa(air: Air) -> float:
    """Return the pressure of water vapour (hPa).

    Saturation over water is 6.1094 exp(17.625 T / (T + 243.04)) hPa, T in deg C (Alduchov &
    Eskridge 1996, J. Appl. Meteor. 35, 601; from memory), times the relative humidity.
    """
    temperature_c = max(air.temperature_c, -100.0)
    saturated_hpa = 6.1094 * np.exp(17.625 * temperature_c / (temperature_c + 243.04))
    return float(saturated_hpa * air.humidity_percent / 100.0)


def standard_refractivity(wavelength_nm: ArrayLike) -> NDArray[np.float64]:
    """Return n - 1 of dry air at 15 deg C and 760 mmHg for a vacuum wavelength (nm).

    Filippenko 1982 eq. 1. Meant for 200 to 2000 nm; it diverges at 156 nm.
    """
    inverse_um2 = (1000.0 / np.asarray(wavelength_nm, dtype=np.float64)) ** 2
    return np.asarray(
        1e-6 * (64.328 + 29498.1 / (146.0 - inverse_um2) + 255.4 / (41.0 - inverse_um2))
    )


def refractivity(wavelength_nm: ArrayLike, air: Air) -> NDArray[np.float64]:
    """Return n - 1 of the air at the telescope for a vacuum wavelength (nm), same shape.

    Filippenko 1982 eqs. 1 to 3: the standard value scaled by pressure and temperature, less
    the part that water vapour displaces.
    """
    pressure_mmhg = air.pressure_hpa / HPA_PER_MMHG
    vapour_mmhg = vapour_pressure_hpa(air) / HPA_PER_MMHG
    expansion = 1.0 + 0.003661 * air.temperature_c
    density = pressure_mmhg * (1.0 + (1.049 - 0.0157 * air.temperature_c) * 1e-6 * pressure_mmhg)
    inverse_um2 = (1000.0 / np.asarray(wavelength_nm, dtype=np.float64)) ** 2
    vapour = 1e-6 * (0.0624 - 0.000680 * inverse_um2) / expansion * vapour_mmhg
    return standard_refractivity(wavelength_nm) * density / (720.883 * expansion) - vapour


def air_wavelength_nm(vacuum_nm: ArrayLike) -> NDArray[np.float64]:
    """Return the wavelength in standard air of a vacuum wavelength (nm), as line lists give it."""
    return np.asarray(vacuum_nm, dtype=np.float64) / (1.0 + standard_refractivity(vacuum_nm))


def tan_zenith_distance(airmass: ArrayLike) -> NDArray[np.float64]:
    """Return tan z, √(X² - 1), of a plane-parallel airmass; 0 just below 1, NaN stays NaN.

    True to 1 % up to airmass 5; nearer the horizon the curved air disperses less than this.
    """
    squared = np.square(np.asarray(airmass, dtype=np.float64)) - 1.0
    return np.asarray(np.sqrt(np.maximum(squared, 0.0)))


def dispersion_arcsec(
    wavelength1_nm: ArrayLike,
    wavelength2_nm: ArrayLike,
    airmass: ArrayLike,
    air: Air,
    *,
    corrected: bool = False,
) -> NDArray[np.float64]:
    """Return how much higher light of wavelength 1 appears than that of wavelength 2, in arcsec.

    Filippenko 1982 eq. 4 with tan z from the airmass (see `tan_zenith_distance`); positive when
    wavelength 1 is the bluer. Wavelengths are vacuum nm, all arguments broadcast, a NaN airmass
    gives NaN. Behind a working dispersion corrector (``corrected``) the residual is taken as 0.
    """
    tangent = tan_zenith_distance(airmass)
    if corrected:
        tangent = 0.0 * tangent
    difference = refractivity(wavelength1_nm, air) - refractivity(wavelength2_nm, air)
    return np.asarray(ARCSEC_PER_RADIAN * difference * tangent)


def filter_dispersion_arcsec(
    filter_: Filter, airmass: ArrayLike, air: Air, *, corrected: bool = False
) -> NDArray[np.float64]:
    """Return the length (arcsec) over which a filter's light is spread along the vertical.

    From edge to edge, wavelength ± width/2, but nothing bluer than 300 nm.
    """
    blue_nm = max(filter_.wavelength_nm - filter_.width_nm / 2.0, SHORTEST_NM)
    red_nm = max(filter_.wavelength_nm + filter_.width_nm / 2.0, blue_nm)
    return dispersion_arcsec(blue_nm, red_nm, airmass, air, corrected=corrected)
