"""One image taken apart: what each blur gives alone, and what would be left without it."""

from __future__ import annotations

import math
from dataclasses import astuple, dataclass, fields

import numpy as np

from engine.image.contour import elongation, size_arcsec, size_without
from engine.image.diffraction import diffraction_fwhm_arcsec
from engine.image.transfer import Blur, Floats

LEAST_PIXELS = 2.0
"""An image smaller than this many pixels is undersampled (common practice: 2 to 3, no source)."""


@dataclass(frozen=True, slots=True)
class Terms:
    """One number (arcsec) for each blur that makes an image."""

    atmosphere: float
    diffraction: float
    optics: float
    tracking: float
    dispersion: float
    sampling: float


@dataclass(frozen=True, slots=True)
class ImageSize:
    """How large a star's image is, and why.

    ``terms`` is the FWHM each blur has alone. Two of them need words: dispersion is the length of
    its smear, and sampling is what the pixel adds to this image in quadrature, because a square
    has no FWHM of its own (it acts like 0.76 to 0.81 of its side in an image it does not rule).
    ``without`` is the size the image would have if just that blur were gone. ``elongation`` is the
    width at half peak along the vertical over that across it.
    """

    size_arcsec: float
    size_px: float
    elongation: float
    terms: Terms
    without: Terms
    undersampled: bool

    @property
    def blame(self) -> str:
        """The term whose removal would shrink the image most, by its name in `Terms`."""
        return blame(self.without)


def blame(without: Terms) -> str:
    """Return the name of the term without which the image would be smallest."""
    names = [field.name for field in fields(Terms)]
    return min(zip(astuple(without), names, strict=True))[1]


class _ScatteredLight(Blur):
    """Turbulence with an outer scale, less the share of light that it leaves unscattered.

    Without an aperture that share would be a point of infinite brightness.
    """

    def round_transfer(self, frequency: Floats) -> Floats:
        """Return the transfer function of the scattered light, 0 at high frequencies."""
        unscattered = Blur.round_transfer(self, np.array(1e30))
        return (Blur.round_transfer(self, frequency) - unscattered) / (1.0 - unscattered)


def atmosphere_fwhm_arcsec(blur: Blur) -> float:
    """Return the FWHM (arcsec) that the atmosphere of a blur gives alone, outer scale included."""
    if blur.outer_scale_m is None or blur.atmosphere_arcsec == 0.0:
        return blur.atmosphere_arcsec
    return size_arcsec(
        _ScatteredLight(
            wavelength_nm=blur.wavelength_nm,
            atmosphere_arcsec=blur.atmosphere_arcsec,
            outer_scale_m=blur.outer_scale_m,
        )
    )


def take_apart(blur: Blur) -> ImageSize:
    """Return the size of a blur's image, its terms, and what it would be without each.

    By direct convolution, a few milliseconds. A blur with nothing but a pixel is a square.
    """
    size = size_arcsec(blur)
    without = Terms(
        atmosphere=size_without(blur, atmosphere_arcsec=0.0),
        diffraction=size_without(blur, aperture_m=math.inf),
        optics=size_without(blur, optics_arcsec=0.0),
        tracking=size_without(blur, tracking_arcsec=0.0),
        dispersion=size_without(blur, dispersion_arcsec=0.0),
        sampling=size_without(blur, pixel_arcsec=0.0),
    )
    terms = Terms(
        atmosphere=atmosphere_fwhm_arcsec(blur),
        diffraction=diffraction_fwhm_arcsec(blur.wavelength_nm, blur.aperture_m, blur.obstruction),
        optics=blur.optics_arcsec,
        tracking=blur.tracking_arcsec,
        dispersion=blur.dispersion_arcsec,
        sampling=math.sqrt(max(size**2 - without.sampling**2, 0.0)),
    )
    size_px = size / blur.pixel_arcsec
    return ImageSize(
        size_arcsec=size,
        size_px=size_px,
        elongation=elongation(blur),
        terms=terms,
        without=without,
        undersampled=size_px < LEAST_PIXELS,
    )
