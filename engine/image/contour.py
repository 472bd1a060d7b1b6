"""The delivered image and its half-peak contour, from transfer functions, in two dimensions.

The image is even in both axes, so it is a cosine transform over one quadrant of frequencies:
P(x, y) = 4 ∫∫ T(fx, fy) cos 2πfx x cos 2πfy y dfx dfy, done with Gauss-Legendre nodes as two matrix
products. x runs along the vertical (dispersion), y across it, both along the sides of the pixels.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cache

import numpy as np

from engine.image.transfer import Blur, Floats

LEAST_CONTRAST = 1e-5
"""Contrast below which frequencies are left out; the size changes by less than 1e-4."""

MOST_CYCLES = 80.0
"""Most cycles of the highest frequency across an image. Where pixel or dispersion are so much wider
than all round blurs that there would be more, edges are softened by 2 % of the image's width."""

RAYS = 12
"""Directions per quadrant in which the contour is found."""

STEPS = 12
"""Most steps of the root search along each ray; five are usual."""


@cache
def _legendre(count: int) -> tuple[Floats, Floats]:
    """Return Gauss-Legendre nodes and weights on 0..1."""
    nodes, weights = np.polynomial.legendre.leggauss(count)
    return 0.5 * (nodes + 1.0), 0.5 * weights


@dataclass(frozen=True, slots=True)
class _Axis:
    """Frequencies (cycles/arcsec) along one axis, with quadrature weights and edge softening."""

    frequency: Floats
    weight: Floats


def _axis(top: float, extent_arcsec: float, pixel_arcsec: float) -> _Axis:
    """Choose as many nodes as an image of this extent needs; fold in the pixel's sinc."""
    soft = top * extent_arcsec > MOST_CYCLES
    if soft:
        top = MOST_CYCLES / extent_arcsec
    unit, weight = _legendre(4 * math.ceil((14.0 + 1.7 * top * extent_arcsec) / 4.0))
    factor = np.sinc(unit * top * pixel_arcsec) * weight * top * 2.0
    if soft:
        factor *= np.exp(math.log(LEAST_CONTRAST) * unit**2)
    return _Axis(unit * top, factor)


class Image:
    """The delivered image of one blur for several lengths K of the dispersion's smear (arcsec).

    Intensities are shares of the star's light per square arcsec.
    """

    def __init__(self, blur: Blur, dispersion_arcsec: Floats) -> None:
        pixel = blur.pixel_arcsec
        longest = float(np.max(dispersion_arcsec))
        top = blur.highest_frequency(LEAST_CONTRAST)
        core = 1.5 / top
        if not math.isfinite(top):
            core = 0.0
            top = 2.0 * MOST_CYCLES / max(pixel, longest)
        along = _axis(top, core + pixel + longest, pixel)
        across = _axis(top, core + pixel, pixel)
        radius = np.hypot(along.frequency[:, None], across.frequency[None, :])
        self._fx, self._fy = along.frequency, across.frequency
        self._transfer = blur.round_transfer(radius) * along.weight[:, None] * across.weight
        self._smear = np.sinc(along.frequency[:, None] * dispersion_arcsec)
        self._half_width = core / 2.0, pixel / 2.0, dispersion_arcsec / 2.0
        self.peak: Floats = self.at(np.zeros((dispersion_arcsec.size, 1)), np.zeros((1, 1)))[:, 0]

    def at(self, x_arcsec: Floats, y_arcsec: Floats) -> Floats:
        """Return the intensity (K, J) at offsets that broadcast to (K, J)."""
        x, y = np.broadcast_arrays(x_arcsec, y_arcsec)
        count, rays = x.shape
        turn = 2.0 * math.pi
        inner = self._transfer @ np.cos(turn * self._fy[:, None] * y.ravel())
        inner *= np.cos(turn * self._fx[:, None] * x.ravel())
        by_smear = inner.reshape(-1, count, rays)
        return np.asarray(np.einsum("ikj,ik->kj", by_smear, self._smear))

    def half_peak_radii(self, cosine: Floats, sine: Floats) -> Floats:
        """Return (K, J) the scale s at which the image falls to half its peak.

        Along rays x = s cosine, y = s sine (arcsec, (K, J)), by bracketed secants (the Illinois
        rule) in s², in which a Gaussian core is nearly straight.
        """
        half = 0.5 * self.peak[:, None]
        low, high = np.zeros_like(cosine), np.ones_like(cosine)
        f_low = np.broadcast_to(half, cosine.shape).copy()
        f_high = self.at(cosine, sine) - half
        for _ in range(STEPS):
            outside = f_high > 0.0
            if not np.any(outside):
                break
            low, f_low = np.where(outside, high, low), np.where(outside, f_high, f_low)
            high = np.where(outside, 1.6 * high, high)
            root = np.sqrt(high)
            f_high = np.where(outside, self.at(root * cosine, root * sine) - half, f_high)
        # A sharp core in a wide halo (outer scale below 2 m) may still be bright there: end here.
        f_high = np.minimum(f_high, -1e-9 * half)
        trial = high
        for _ in range(STEPS):
            last, trial = trial, low + (high - low) * f_low / (f_low - f_high)
            if np.all(np.abs(trial - last) < 2e-4 * trial):
                break
            root = np.sqrt(trial)
            value = self.at(root * cosine, root * sine) - half
            inside = value > 0.0
            f_high = np.where(inside, np.where(last == low, 0.5 * f_high, f_high), value)
            f_low = np.where(inside, value, np.where(last == high, 0.5 * f_low, f_low))
            low, high = np.where(inside, trial, low), np.where(inside, high, trial)
        return np.asarray(np.sqrt(trial))

    def _guess(self) -> tuple[Floats, Floats]:
        """Return rough half-widths (arcsec) along and across the smear, each (K, 1)."""
        core, pixel, smear = self._half_width
        across = np.full_like(smear, (core**2.5 + pixel**2.5) ** 0.4)
        along = (across**2.5 + smear**2.5) ** 0.4
        return along[:, None], across[:, None]

    def half_widths_arcsec(self) -> tuple[Floats, Floats]:
        """Return the half-widths at half peak (K,) along the smear and across it."""
        along, across = self._guess()
        zero = np.zeros_like(along)
        scales = self.half_peak_radii(
            np.concatenate([along, zero], axis=1), np.concatenate([zero, across], axis=1)
        )
        return along[:, 0] * scales[:, 0], across[:, 0] * scales[:, 1]

    def size_arcsec(self) -> Floats:
        """Return the diameter (K,) of the circle as large as the area above half the peak.

        The contour is even in both axes, so equally spaced rays over a quadrant, stretched to the
        image's proportions, integrate its area with an error that falls exponentially.
        """
        along, across = self._guess()
        angle = (np.arange(RAYS) + 0.5) * (0.5 * math.pi / RAYS)
        scales = self.half_peak_radii(along * np.cos(angle), across * np.sin(angle))
        area = math.pi * along[:, 0] * across[:, 0] * np.mean(scales**2, axis=1)
        return np.asarray(2.0 * np.sqrt(area / math.pi))


def size_arcsec(blur: Blur) -> float:
    """Return the size (arcsec) of one image by direct convolution; see `Image.size_arcsec`."""
    return float(Image(blur, np.array([blur.dispersion_arcsec])).size_arcsec()[0])


def size_without(blur: Blur, **absent: float) -> float:
    """Return the size (arcsec) with some blurs changed, as in ``optics_arcsec=0.0``."""
    return size_arcsec(replace(blur, **absent))


def elongation(blur: Blur) -> float:
    """Return the image's width at half peak along the vertical over that across it."""
    along, across = Image(blur, np.array([blur.dispersion_arcsec])).half_widths_arcsec()
    return float(along[0] / across[0])


LONG_SMEAR = 8.0
"""Smears longer than so many widths of the rest are extrapolated: the area above half the peak then
grows by equal amounts with the length, and the peak falls as its inverse."""


def sizes_and_peaks(blur: Blur, dispersion_arcsec: Floats) -> tuple[Floats, Floats]:
    """Return sizes (K,) in arcsec and central intensities (K,) per arcsec², by direct convolution.

    For rising lengths (K,) of the smear; that of ``blur`` is ignored. Lengths share one transform,
    or a few when pixel or smear outweigh the round blurs.
    """
    top = blur.highest_frequency(LEAST_CONTRAST)
    width = 1.5 / top + blur.pixel_arcsec
    limit = LONG_SMEAR * width
    computed = dispersion_arcsec[dispersion_arcsec < limit]
    if computed.size < dispersion_arcsec.size:
        computed = np.append(computed, [limit, 1.25 * limit])
    extent = width + computed
    group = np.zeros(computed.size)
    if top * extent[-1] > MOST_CYCLES:
        group = np.floor(np.log2(extent / width))
    images = [Image(blur, computed[group == each]) for each in np.unique(group)]
    sizes = np.concatenate([image.size_arcsec() for image in images])
    peaks = np.concatenate([image.peak for image in images])
    far = np.maximum(dispersion_arcsec / limit, 1.0)
    near = np.minimum(np.arange(dispersion_arcsec.size), max(computed.size - 2, 0))
    if computed.size > 1 and computed[-1] > limit:
        growth = max(sizes[-1] ** 2 - sizes[-2] ** 2, 0.0) / 0.25
        return np.sqrt(sizes[near] ** 2 + growth * (far - 1.0)), peaks[near] / far
    return sizes, peaks
