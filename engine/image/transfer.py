"""How each blur carries detail: transfer functions against spatial frequency.

A star's image is the convolution of every blur, so its transfer function is the product of theirs.
Each function takes frequencies in cycles per arcsec and returns the share of contrast that is left,
1 at frequency zero.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from engine.logbook.observatory import ARCSEC_PER_RADIAN

Floats = NDArray[np.float64]

KOLMOGOROV_FWHM = 0.9758634299
"""FWHM of a long exposure through Kolmogorov turbulence in units of λ/r0 (Racine 1996, PASP 108,
699; GalSim agrees). The literature rounds it to 0.976 or 0.98."""

KOLMOGOROV_PHASE = 6.8838771823
"""Phase structure function D(r) = 6.88 (r/r0)^(5/3), 2 (24/5 Γ(6/5))^(5/6) (Fried 1966)."""

_GAUSSIAN = math.pi**2 / (4.0 * math.log(2.0))


def fried_parameter_m(fwhm_arcsec: float, wavelength_nm: float) -> float:
    """Return r0 (m) at the wavelength (nm) where Kolmogorov images have this FWHM (arcsec)."""
    return KOLMOGOROV_FWHM * wavelength_nm * 1e-9 * ARCSEC_PER_RADIAN / fwhm_arcsec


def atmosphere_factor(wavelength_nm: float, airmass: Floats) -> Floats:
    """Return the Kolmogorov FWHM at a wavelength and airmass over that at 500 nm and the zenith.

    X^(3/5) (λ/500 nm)^(-1/5): Fried 1966, Roddier 1981.
    """
    return np.asarray(airmass**0.6 * (wavelength_nm / 500.0) ** -0.2)


def gaussian(frequency: Floats, fwhm_arcsec: float) -> Floats:
    """Return the transfer function of a round Gaussian blur, exp(-(π f w)² / (4 ln 2))."""
    return np.asarray(np.exp(-_GAUSSIAN * np.square(frequency * fwhm_arcsec)))


def kolmogorov(frequency: Floats, fwhm_arcsec: float) -> Floats:
    """Return the long-exposure transfer function, exp(-3.44 (λ f / r0)^(5/3)) (Fried 1966)."""
    scaled = frequency * (fwhm_arcsec / KOLMOGOROV_FWHM)
    return np.asarray(np.exp(-0.5 * KOLMOGOROV_PHASE * scaled ** (5.0 / 3.0)))


@cache
def _von_karman_table() -> tuple[Floats, Floats]:
    """Tabulate ln of the saturation against ln x: see `von_karman_saturation`."""
    log_x = np.linspace(math.log(1e-10), math.log(1e3), 931)
    power = 5.0 / 6.0
    log_s = np.arange(-90.0, 4.5, 0.125)
    weight = np.exp(power * log_s - np.exp(log_s)) * 0.125
    share = -np.expm1(-np.exp(2.0 * log_x[:, None] - log_s) / 4.0)
    return log_x, np.log(share @ weight / math.gamma(power))


def von_karman_saturation(x: Floats) -> Floats:
    """Return 1 - 2^(1/6) x^(5/6) K₅⸝₆(x) / Γ(5/6), which rises from 0 to 1.

    With x^ν K_ν(x) = 2^(ν-1) ∫ s^(ν-1) exp(-s - x²/4s) ds (Watson, Bessel Functions, 6.22 (15))
    the difference becomes ∫ s^(ν-1) e^(-s) (1 - exp(-x²/4s)) ds / Γ(ν), free of cancellation; the
    trapezoid rule in ln s gives it to 1e-9, a table in ln x (step 0.03) to 1e-4.
    """
    log_x, log_value = _von_karman_table()
    with np.errstate(divide="ignore"):
        wanted = np.log(x)
    return np.asarray(np.where(x > 0.0, np.exp(np.interp(wanted, log_x, log_value)), 0.0))


def von_karman(
    frequency: Floats, fwhm_arcsec: float, wavelength_nm: float, outer_scale_m: float
) -> Floats:
    """Return the long-exposure transfer function of turbulence with an outer scale (m).

    exp(-D/2) with the von Karman structure function (Tokovinin 2002, PASP 114, 1156; Conan 2000):
    D(r) = D∞ [1 - 2^(1/6) x^(5/6) K₅⸝₆(x) / Γ(5/6)], x = 2π r / L0, r = λ f, and
    D∞ = (L0/r0)^(5/3) Γ(11/6) Γ(5/6) π^(-8/3) (24/5 Γ(6/5))^(5/6) = 0.1726 (L0/r0)^(5/3).
    ``fwhm_arcsec`` is that of Kolmogorov turbulence with the same r0.
    """
    r0_m = fried_parameter_m(fwhm_arcsec, wavelength_nm)
    baseline_m = frequency * (wavelength_nm * 1e-9 * ARCSEC_PER_RADIAN)
    full = (
        math.gamma(11.0 / 6.0)
        * math.gamma(5.0 / 6.0)
        * math.pi ** (-8.0 / 3.0)
        * (24.0 / 5.0 * math.gamma(6.0 / 5.0)) ** (5.0 / 6.0)
        * (outer_scale_m / r0_m) ** (5.0 / 3.0)
    )
    return np.asarray(
        np.exp(-0.5 * full * von_karman_saturation(2.0 * math.pi * baseline_m / outer_scale_m))
    )


def _lens_area(distance: Floats, radius1: float, radius2: float) -> Floats:
    """Return the area common to two circles, lengths in pupil diameters; 0 for a mere point."""
    small = min(radius1, radius2)
    if small < 1e-6:
        return np.zeros_like(distance)
    d = np.clip(distance, abs(radius1 - radius2), radius1 + radius2)
    d = np.maximum(d, 1e-12 * small)
    cos1 = np.clip((d**2 + radius1**2 - radius2**2) / (2.0 * d * radius1), -1.0, 1.0)
    cos2 = np.clip((d**2 + radius2**2 - radius1**2) / (2.0 * d * radius2), -1.0, 1.0)
    kite = np.sqrt(np.maximum(radius1**2 - (radius1 * cos1) ** 2, 0.0)) * d
    return np.asarray(radius1**2 * np.arccos(cos1) + radius2**2 * np.arccos(cos2) - kite)


def aperture(
    frequency: Floats, wavelength_nm: float, aperture_m: float, obstruction: float
) -> Floats:
    """Return the transfer function of a round pupil with a central obstruction (by diameter).

    The pupil's overlap with its own shifted copy, λ f / D apart, in exact circle geometry
    (O'Neill 1956, J. Opt. Soc. Am. 46, 285); 0 beyond D/λ.
    """
    shift = frequency * (wavelength_nm * 1e-9 * ARCSEC_PER_RADIAN / aperture_m)
    outer, inner = 0.5, 0.5 * obstruction
    common = (
        _lens_area(shift, outer, outer)
        + _lens_area(shift, inner, inner)
        - 2.0 * _lens_area(shift, outer, inner)
    )
    return np.asarray(np.maximum(common / (math.pi * (outer**2 - inner**2)), 0.0))


@dataclass(frozen=True, slots=True, kw_only=True)
class Blur:
    """Everything that makes one star's image; each is absent unless given.

    ``atmosphere_arcsec`` is the FWHM that Kolmogorov turbulence would give at this wavelength and
    airmass, whatever the outer scale; ``dispersion_arcsec`` the length of the smear along the
    vertical, taken as parallel to a side of the square pixels.
    """

    wavelength_nm: float
    aperture_m: float = math.inf
    obstruction: float = 0.0
    atmosphere_arcsec: float = 0.0
    outer_scale_m: float | None = None
    optics_arcsec: float = 0.0
    tracking_arcsec: float = 0.0
    dispersion_arcsec: float = 0.0
    pixel_arcsec: float = 0.0

    def round_transfer(self, frequency: Floats) -> Floats:
        """Return the product of the round blurs: all but dispersion and pixel."""
        product = gaussian(frequency, math.hypot(self.optics_arcsec, self.tracking_arcsec))
        if math.isfinite(self.aperture_m):
            product *= aperture(frequency, self.wavelength_nm, self.aperture_m, self.obstruction)
        if self.atmosphere_arcsec > 0.0:
            if self.outer_scale_m is None:
                product *= kolmogorov(frequency, self.atmosphere_arcsec)
            else:
                product *= von_karman(
                    frequency, self.atmosphere_arcsec, self.wavelength_nm, self.outer_scale_m
                )
        return product

    def highest_frequency(self, least: float) -> float:
        """Return a frequency beyond which less than ``least`` of any contrast gets through.

        Infinite when nothing round blurs the image.
        """
        width = math.hypot(self.optics_arcsec, self.tracking_arcsec)
        tops = [self.aperture_m / (self.wavelength_nm * 1e-9 * ARCSEC_PER_RADIAN)]
        if width > 0.0:
            tops.append(math.sqrt(-math.log(least) / _GAUSSIAN) / width)
        if self.atmosphere_arcsec > 0.0:
            scaled = (-2.0 * math.log(least) / KOLMOGOROV_PHASE) ** 0.6
            turbulent = scaled * KOLMOGOROV_FWHM / self.atmosphere_arcsec
            if self.outer_scale_m is not None:
                # Past 2.5 outer scales the structure function is flat: it cuts there or never.
                flat = 2.5 * self.outer_scale_m / (self.wavelength_nm * 1e-9 * ARCSEC_PER_RADIAN)
                turbulent = min(10.0 * turbulent, flat)
            if self.round_transfer(np.array([turbulent]))[0] <= 1.001 * least:
                tops.append(turbulent)
        top = min(tops)
        if not math.isfinite(top):
            return top
        trial = top * np.geomspace(1e-3, 1.0, 120)
        blurred = np.flatnonzero(self.round_transfer(trial) < least)
        return float(trial[blurred[0]]) if blurred.size else top
