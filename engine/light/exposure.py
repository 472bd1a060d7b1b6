"""What an exposure will reach: signal, noise, depth, and how long is too long.

Sums are in electrons. Magnitudes of stars are outside the atmosphere, those of the sky as seen
from below it, on one zero point: the way both are published.

The noise is the full one of Merline & Howell 1995 (Exp. Astron. 6, 163) with scintillation::

    noise^2 = S + n (1 + n / n_B) (N_sky + N_dark + R^2 + (g / sqrt 12)^2) + (sigma_scint S)^2

S the star's electrons in the aperture, n its pixels, n_B the pixels the sky was measured in, R the
read noise and g electrons per count (rounding to whole counts). Every term but R and g grows with
time, scintillation too, since its variance falls as 1/t: so exposure time and limiting magnitude
have closed forms.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Self

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.light.scintillation import scintillation_rms

if TYPE_CHECKING:
    from engine.logbook import Observatory

Floats = NDArray[np.float64]

# The aperture that sees a faint star best has a radius of 0.67 FWHM for a Gaussian image; about 0.7
# is usual for real ones.
BEST_RADIUS_FWHM = 0.7


@dataclass(frozen=True, slots=True)
class Aperture:
    """A circle that a star is measured in: radius (arcsec), share of the star's light inside."""

    radius_arcsec: ArrayLike
    enclosed_share: ArrayLike

    @classmethod
    def best(cls, image_size_arcsec: float, enclosed: Callable[[float], float]) -> Self:
        """Return the aperture for a faint star; ``enclosed`` tells the share within a radius."""
        radius_arcsec = BEST_RADIUS_FWHM * image_size_arcsec
        return cls(radius_arcsec, enclosed(radius_arcsec))


@dataclass(frozen=True, slots=True)
class Conditions:
    """What an exposure meets: airmass, sky (mag per square arcsecond), aperture; arrays broadcast.

    ``sky_pixels`` is how many pixels the sky beside the star is measured in.
    """

    airmass: ArrayLike
    sky_mag_arcsec2: ArrayLike
    aperture: Aperture
    sky_pixels: float = math.inf


@dataclass(frozen=True, slots=True)
class Subexposures:
    """A long exposure in parts: how many, of what length (s), and what is gained or given up.

    ``read_noise_share`` is by how much read noise raises the noise of the sum; ``saturated`` says
    that parts short enough for the star would cost more read noise than was allowed.
    """

    count: int
    seconds: float
    read_noise_share: float
    saturated: bool


@dataclass(frozen=True, slots=True)
class ExposureModel:
    """One filter, telescope and camera, as far as an exposure needs them."""

    zero_point_mag: float
    extinction_mag: float
    aperture_m: float
    elevation_m: float
    pixel_arcsec: float
    read_noise_e: float
    dark_e_per_s: float
    gain_e_per_adu: float
    saturation_adu: float

    @classmethod
    def of(cls, observatory: Observatory, filter_index: int) -> Self:
        """Return the model of one filter of an observatory."""
        filter_, camera = observatory.filters[filter_index], observatory.camera
        return cls(
            zero_point_mag=filter_.zero_point_mag,
            extinction_mag=filter_.extinction_mag,
            aperture_m=observatory.telescope.aperture_m,
            elevation_m=observatory.site.elevation_m,
            pixel_arcsec=observatory.pixel_arcsec,
            read_noise_e=camera.read_noise_e,
            dark_e_per_s=camera.dark_e_per_s,
            gain_e_per_adu=camera.gain_e_per_adu,
            saturation_adu=camera.saturation_adu,
        )

    def star_e_per_s(self, magnitude: ArrayLike, airmass: ArrayLike) -> Floats:
        """Return a star's electrons per second: 10^(0.4 (zero point - m - k X)); broadcast."""
        dimmed = np.asarray(magnitude, dtype=float) + self.extinction_mag * np.asarray(airmass)
        return np.asarray(10.0 ** (0.4 * (self.zero_point_mag - dimmed)))

    def sky_e_per_s_per_pixel(self, sky_mag_arcsec2: ArrayLike) -> Floats:
        """Return the sky's electrons per second in one pixel."""
        sky = np.asarray(sky_mag_arcsec2, dtype=float)
        return np.asarray(10.0 ** (0.4 * (self.zero_point_mag - sky)) * self.pixel_arcsec**2)

    def signal_to_noise(
        self, magnitude: ArrayLike, seconds: ArrayLike, seen: Conditions, *, exposures: int = 1
    ) -> Floats:
        """Return the signal-to-noise of a star in an exposure (s), or in the sum of several.

        Arrays broadcast; NaN where an input is, and without a time. For few electrons (below about
        20 in all) the noise is not Gaussian and the number only a guide.
        """
        time_s = _time_s(seconds)
        rate = self._star_rate(magnitude, seen)
        growing, fixed = self._noise(seen)
        variance = (rate + growing + self._flicker(seen) * rate**2) * time_s + fixed
        return np.asarray(math.sqrt(exposures) * rate * time_s / np.sqrt(variance))

    def seconds_for(
        self, signal_to_noise: ArrayLike, magnitude: ArrayLike, seen: Conditions
    ) -> Floats:
        """Return the length of one exposure (s) that reaches a signal-to-noise; broadcast.

        The root of rate^2 t^2 - q^2 (A t + B) = 0, A and B the growing and the fixed variance.
        """
        wanted = np.asarray(signal_to_noise, dtype=float) ** 2
        rate = self._star_rate(magnitude, seen)
        growing, fixed = self._noise(seen)
        linear = wanted * (rate + growing + self._flicker(seen) * rate**2)
        return np.asarray(
            (linear + np.sqrt(linear**2 + 4.0 * rate**2 * wanted * fixed)) / (2.0 * rate**2)
        )

    def limiting_magnitude(
        self, signal_to_noise: ArrayLike, seconds: ArrayLike, seen: Conditions
    ) -> Floats:
        """Return the faintest magnitude that reaches a signal-to-noise in an exposure (s).

        S = (q^2 + sqrt(q^4 + 4 q^2 N u)) / 2u with u = 1 - q^2 sigma_scint^2. NaN where
        scintillation alone keeps every star, however bright, below it, and without a time.
        """
        time_s = _time_s(seconds)
        wanted = np.asarray(signal_to_noise, dtype=float) ** 2
        growing, fixed = self._noise(seen)
        left = 1.0 - wanted * self._flicker(seen) / time_s
        left = np.where(left > 0.0, left, np.nan)
        noise = growing * time_s + fixed
        electrons = (wanted + np.sqrt(wanted**2 + 4.0 * wanted * noise * left)) / (2.0 * left)
        per_magnitude_zero = self._star_rate(0.0, seen)
        return np.asarray(-2.5 * np.log10(electrons / (time_s * per_magnitude_zero)))

    def saturation_s(
        self,
        magnitude: ArrayLike,
        airmass: ArrayLike,
        sky_mag_arcsec2: ArrayLike,
        peak_fraction: ArrayLike,
    ) -> Floats:
        """Return how long (s) until a star's brightest pixel saturates; broadcast.

        ``peak_fraction`` is the share of the star's light in that pixel. The camera's bias level
        is not known here: with one of hundreds of counts the time is that much shorter.
        """
        rate = (
            self.star_e_per_s(magnitude, airmass) * np.asarray(peak_fraction)
            + self.sky_e_per_s_per_pixel(sky_mag_arcsec2)
            + self.dark_e_per_s
        )
        return np.asarray(self.saturation_adu * self.gain_e_per_adu / rate)

    def sky_limited_s(
        self, sky_mag_arcsec2: ArrayLike, *, read_noise_share: ArrayLike = 0.05
    ) -> Floats:
        """Return the length (s) from which read noise adds at most such a share to sky noise.

        R^2 / (rate ((1 + share)^2 - 1)), rate of sky and dark together. 5 % is common practice.
        """
        rate = self.sky_e_per_s_per_pixel(sky_mag_arcsec2) + self.dark_e_per_s
        return np.asarray(
            self._read_variance() / (rate * ((1.0 + np.asarray(read_noise_share)) ** 2 - 1.0))
        )

    def is_sky_limited(self, seconds: ArrayLike, sky_mag_arcsec2: ArrayLike) -> NDArray[np.bool_]:
        """Say whether read noise adds no more than 5 % to the noise of the sky in exposures (s)."""
        return np.asarray(np.asarray(seconds) >= self.sky_limited_s(sky_mag_arcsec2))

    def best_subexposures(
        self,
        total_s: float,
        sky_mag_arcsec2: float,
        *,
        longest_s: float = math.inf,
        read_noise_share: float = 0.05,
    ) -> Subexposures:
        """Return the most parts of a total time (s) whose read noise costs no more than a share.

        Both times positive. More, shorter parts lose less to a trailed frame or a cloud.
        ``longest_s`` is what saturation allows, and wins.
        """
        shortest_s = float(self.sky_limited_s(sky_mag_arcsec2, read_noise_share=read_noise_share))
        count = max(math.floor(total_s / shortest_s), 1)
        if total_s / count > longest_s:
            count = math.ceil(total_s / longest_s)
        seconds = total_s / count
        rate = float(self.sky_e_per_s_per_pixel(sky_mag_arcsec2)) + self.dark_e_per_s
        raised = math.sqrt(1.0 + self._read_variance() / (rate * seconds)) - 1.0
        return Subexposures(count, seconds, raised, saturated=longest_s < shortest_s)

    def _star_rate(self, magnitude: ArrayLike, seen: Conditions) -> Floats:
        inside = np.asarray(seen.aperture.enclosed_share, dtype=float)
        return np.asarray(self.star_e_per_s(magnitude, seen.airmass) * inside)

    def _noise(self, seen: Conditions) -> tuple[Floats, Floats]:
        """Return the variance beside the star's own: growing (per s) and fixed."""
        radius = np.asarray(seen.aperture.radius_arcsec, dtype=float)
        pixels = math.pi * (radius / self.pixel_arcsec) ** 2
        counted = pixels * (1.0 + pixels / seen.sky_pixels)
        rate = self.sky_e_per_s_per_pixel(seen.sky_mag_arcsec2) + self.dark_e_per_s
        return np.asarray(counted * rate), np.asarray(counted * self._read_variance())

    def _read_variance(self) -> float:
        return self.read_noise_e**2 + self.gain_e_per_adu**2 / 12.0

    def _flicker(self, seen: Conditions) -> Floats:
        """Return the variance of scintillation in one second, as a fraction squared."""
        return scintillation_rms(self.aperture_m, seen.airmass, 1.0, self.elevation_m) ** 2


def _time_s(seconds: ArrayLike) -> Floats:
    """Return times (s), NaN for what is none."""
    time_s = np.asarray(seconds, dtype=float)
    return np.where(time_s > 0.0, time_s, np.nan)
