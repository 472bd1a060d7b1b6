"""Image size: how large stars will be in each filter, and which blur is to blame.

Every blur (atmosphere, diffraction, optics, tracking, dispersion, pixel) is a transfer function;
their product, transformed, is the image, whose area above half its peak is its size. Tables make
that quick enough for every target at every minute of the night.
"""

from __future__ import annotations

from engine.image.dispersion import dispersion_arcsec, filter_dispersion_arcsec, refractivity
from engine.image.model import ImageModel
from engine.image.prepared import Prepared
from engine.image.terms import ImageSize, Terms, blame

__all__ = [
    "ImageModel",
    "ImageSize",
    "Prepared",
    "Terms",
    "blame",
    "dispersion_arcsec",
    "filter_dispersion_arcsec",
    "refractivity",
]
