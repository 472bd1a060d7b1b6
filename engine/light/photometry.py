"""How much light a star of magnitude 0 sends, as a check on the zero points of a logbook."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
    from engine.logbook import Filter, Telescope

Floats = NDArray[np.float64]

JANSKY_W_PER_M2_HZ = 1e-26
PLANCK_J_S = 6.62607015e-34  # exact, SI
LIGHT_M_PER_S = 299792458.0  # exact, SI
AB_ZERO_JY = 3631.0  # the AB magnitude's definition

# Flux of Vega at magnitude 0, f_lambda in W per square metre and nm (the table's 1e-11 erg/s/cm2/A
# times 1e-13), by effective wavelength (nm): Bessell, Castelli & Plez 1998, A&A 333, 231, Table A2;
# its V from memory.
_VEGA_NM = np.array([360.0, 438.0, 545.0, 641.0, 798.0])
_VEGA_W_PER_M2_NM = 1e-13 * np.array([417.5, 632.0, 363.1, 217.7, 112.6])

# The share of starlight that ends as electrons, mirrors to detector, in any telescope that works:
# below, light is lost somewhere; above, the zero point or the aperture is mistyped. Common
# practice, no source.
PLAUSIBLE_THROUGHPUT = (0.03, 0.9)


def photons_per_s_m2_nm(flux_jy: ArrayLike, wavelength_nm: ArrayLike) -> Floats:
    """Return photons per second, square metre and nanometre of a flux (Jy): F_nu / (h lambda)."""
    flux = JANSKY_W_PER_M2_HZ * np.asarray(flux_jy, dtype=float)
    return np.asarray(flux / (PLANCK_J_S * np.asarray(wavelength_nm, dtype=float)))


def vega_photons_per_s_m2_nm(wavelength_nm: ArrayLike) -> Floats:
    """Return photons per second, square metre and nanometre of magnitude 0: f lambda / (h c).

    Between the published bands interpolated, beyond them held.
    """
    wavelength = np.asarray(wavelength_nm, dtype=float)
    flux = np.interp(wavelength, _VEGA_NM, _VEGA_W_PER_M2_NM)
    return np.asarray(flux * wavelength * 1e-9 / (PLANCK_J_S * LIGHT_M_PER_S))


def implied_throughput(filter_: Filter, telescope: Telescope) -> float:
    """Return the share of photons at the pupil that a filter's zero point claims to detect.

    10^(0.4 zero point) electrons over the photons of magnitude 0 on the clear area across the
    filter's width. Vega magnitudes are assumed; AB ones would differ by tenths of a magnitude.
    """
    flux = float(vega_photons_per_s_m2_nm(filter_.wavelength_nm))
    photons_per_s = flux * telescope.collecting_area_m2 * filter_.width_nm
    return float(10.0 ** (0.4 * filter_.zero_point_mag) / photons_per_s)


def zero_point_doubt(filter_: Filter, telescope: Telescope) -> str | None:
    """Return a sentence when a filter's zero point can't be right for the telescope, else None."""
    low, high = PLAUSIBLE_THROUGHPUT
    throughput = implied_throughput(filter_, telescope)
    if low <= throughput <= high:
        return None
    return (
        f"zero_point_mag {filter_.zero_point_mag:g} in {filter_.name} would mean that "
        f"{100.0 * throughput:.2g} % of the light is detected, expected {100.0 * low:g} to "
        f"{100.0 * high:g} %: check it, the aperture and width_nm"
    )
