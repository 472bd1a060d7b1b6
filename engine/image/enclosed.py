"""How much of a star's light falls inside a circle on the delivered image."""

from __future__ import annotations

import math

import numpy as np

from engine.image.contour import LEAST_CONTRAST
from engine.image.diffraction import bessel_j1
from engine.image.transfer import Blur, Floats

MOST_CYCLES = 500.0
"""Most cycles of the highest frequency across circle and image; finer detail is smoothed, which
blurs the circle's edge by less than half a percent of its radius."""


def _panels(count: int) -> tuple[Floats, Floats]:
    """Return quadrature nodes and weights on 0..1: ``count`` panels of 32 Gauss-Legendre nodes."""
    node, weight = np.polynomial.legendre.leggauss(32)
    start = np.arange(count)[:, None]
    unit = (start + 0.5 * (node + 1.0)) / count
    return unit.ravel(), np.broadcast_to(0.5 * weight / count, unit.shape).ravel()


def enclosed_share(blur: Blur, radius_arcsec: float) -> float:
    """Return the share (0 to 1) of the light within a radius (arcsec) of the image's centre.

    2πR ∫ T(f) J₁(2πRf) df with T averaged over all directions, which is exact for a circle even
    where the image is long. 0 for no radius or a negative one, NaN for NaN.
    """
    if math.isnan(radius_arcsec):
        return math.nan
    if radius_arcsec <= 0.0:
        return 0.0
    if math.isinf(radius_arcsec):
        return 1.0
    sides = blur.pixel_arcsec + blur.dispersion_arcsec
    finest, top = blur.highest_frequency(LEAST_CONTRAST), MOST_CYCLES / (sides + radius_arcsec)
    softening = math.log(LEAST_CONTRAST) if top < finest else 0.0
    top = min(top, finest)
    unit, weight = _panels(2 + math.ceil(0.3 * top * (sides + radius_arcsec)))
    # Cubed nodes crowd towards frequency zero, where turbulence has its f^(5/3) cusp.
    frequency = top * unit**3
    weight = weight * top * 3.0 * unit**2 * np.exp(softening * unit**6)
    directions = 8 + math.ceil(2.0 * top * sides)
    angle = (np.arange(directions) + 0.5) * (0.5 * math.pi / directions)
    fx, fy = np.outer(frequency, np.cos(angle)), np.outer(frequency, np.sin(angle))
    square = np.sinc(blur.pixel_arcsec * fx) * np.sinc(blur.pixel_arcsec * fy)
    average = np.mean(square * np.sinc(blur.dispersion_arcsec * fx), axis=1)
    turn = 2.0 * math.pi * radius_arcsec
    inside = turn * np.sum(
        weight * blur.round_transfer(frequency) * average * bessel_j1(turn * frequency)
    )
    return float(np.clip(inside, 0.0, 1.0))
