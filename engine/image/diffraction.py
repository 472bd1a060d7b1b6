"""Diffraction by a round pupil with a central obstruction, in closed form."""

from __future__ import annotations

import math

import numpy as np

from engine.image.transfer import Floats
from engine.logbook.observatory import ARCSEC_PER_RADIAN


def bessel_j1(x: Floats) -> Floats:
    """Return the Bessel function J₁ for x of 0 or more.

    Polynomials of Abramowitz & Stegun 9.4.4 and 9.4.6, right to 1e-7 or better.
    """
    near = np.square(np.minimum(x, 3.0) / 3.0)
    small = x * np.polynomial.polynomial.polyval(
        near, [0.5, -0.56249985, 0.21093573, -0.03954289, 0.00443319, -0.00031761, 0.00001109]
    )
    safe = np.maximum(x, 3.0)
    size = np.polynomial.polynomial.polyval(
        3.0 / safe,
        [0.79788456, 0.00000156, 0.01659667, 0.00017105, -0.00249511, 0.00113653, -0.00020033],
    )
    phase = safe + np.polynomial.polynomial.polyval(
        3.0 / safe,
        [-2.35619449, 0.12499612, 0.00005650, -0.00637879, 0.00074348, 0.00079824, -0.00029166],
    )
    return np.asarray(np.where(x < 3.0, small, size * np.cos(phase) / np.sqrt(safe)))


def diffraction_amplitude(x: Floats, obstruction: float) -> Floats:
    """Return the amplitude of the pattern, 1 at its centre, at x = π D sin θ / λ above 0.

    2 [J₁(x) - ε J₁(εx)] / [x (1 - ε²)] with ε the obstruction by diameter (Born & Wolf 8.6.2; from
    memory). Its square is the intensity, its zeros are the dark rings.
    """
    through = bessel_j1(x) - obstruction * bessel_j1(obstruction * x)
    return np.asarray(2.0 * through / (x * (1.0 - obstruction**2)))


def diffraction_fwhm_arcsec(wavelength_nm: float, aperture_m: float, obstruction: float) -> float:
    """Return the FWHM (arcsec) of an aperture's diffraction pattern; 1.029 λ/D unobstructed."""
    x = np.linspace(
        1.0, 1.7, 3501
    )  # Half peak lies at 1.616 unobstructed, at 1.126 for a thin ring.
    intensity = diffraction_amplitude(x, obstruction) ** 2
    half_width = float(np.interp(-0.5, -intensity, x))
    return 2.0 * half_width / math.pi * wavelength_nm * 1e-9 / aperture_m * ARCSEC_PER_RADIAN
