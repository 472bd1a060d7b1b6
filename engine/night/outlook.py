"""The part of the night's tables that depends on the seeing: image size, softness, quality.

Rebuilt whenever the seeing forecast moves; the geometry behind it stays.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.image import ImageModel, Prepared
from engine.light import Reference, clear_share, depth_share
from engine.night.tables import Night

Singles = NDArray[np.float32]


@dataclass(frozen=True, slots=True)
class Outlook:
    """What a forecast of the seeing means for every filter, target and moment.

    ``seeing_arcsec`` (T,) is the zenith seeing at 500 nm, ``high_arcsec`` (T,) the upper end of its
    68 % band, ``image_size_arcsec`` (F, N, T) the delivered size, ``soft`` (F, N, T) where that is
    above the target's own limit, ``chance`` (F, N, T) how likely it is to stay below it as far as
    the seeing is known, ``quality`` (F, N, T) what a second there is worth against the plan's
    reference conditions; 0 where there is no airmass.
    """

    seeing_arcsec: NDArray[np.float64]
    high_arcsec: NDArray[np.float64]
    image_size_arcsec: Singles
    soft: NDArray[np.bool_]
    chance: Singles
    quality: Singles


class Outlooks:
    """Makes one outlook after another for the same night: what can be kept between them is kept."""

    def __init__(self, night: Night, model: ImageModel) -> None:
        self._prepared: Prepared = model.prepare(night.airmass)
        filters = night.observatory.filters
        self._references = tuple(
            Reference.of(night.observatory, model, index) for index in range(len(filters))
        )
        # Sky and extinction do not mind the seeing: their half of the credit is worked out once.
        self._clear = [
            clear_share(sky, night.airmass, each, reference).astype(np.float32)
            for sky, each, reference in zip(
                night.sky_mag_arcsec2, filters, self._references, strict=True
            )
        ]
        limits = [target.maximum_image_size_arcsec for target in night.targets]
        self._limit_arcsec = np.array(
            [np.inf if limit is None else limit for limit in limits], dtype=np.float32
        )[None, :, None]
        self._limited = np.flatnonzero([limit is not None for limit in limits])
        self._prepared_limited: Prepared = model.prepare(night.airmass[self._limited])

    def given(
        self, seeing_arcsec: NDArray[np.float64], high_arcsec: NDArray[np.float64] | None = None
    ) -> Outlook:
        """Return the outlook for a zenith seeing (T,) at 500 nm, in arcsec.

        ``high_arcsec`` (T,) is the upper end of its 68 % band; without one it is taken as certain.
        """
        sizes = self._prepared.sizes_arcsec(seeing_arcsec)
        quality = np.stack(
            [
                depth_share(size, clear, reference)
                for size, clear, reference in zip(sizes, self._clear, self._references, strict=True)
            ]
        ).astype(np.float32)
        return Outlook(
            seeing_arcsec=seeing_arcsec,
            high_arcsec=seeing_arcsec if high_arcsec is None else high_arcsec,
            image_size_arcsec=sizes,
            soft=sizes > self._limit_arcsec,
            chance=self._chances(sizes, high_arcsec),
            quality=np.nan_to_num(quality, nan=0.0),
        )

    def _chances(self, sizes: Singles, high_arcsec: NDArray[np.float64] | None) -> Singles:
        """Return how likely images (F, N, T) are within their limits.

        A limit is a cliff, and the forecast is not that sure: an hour that will just do is worth
        less than one that will do anyhow. The seeing is log-normal about its median, and the size
        of an image, over so small a span, a power of it; so with the sizes at the median and at
        the upper end of the 68 % band, the chance is the normal distribution's at
        ln(limit / size) / ln(size at the upper end / size).
        """
        within = (sizes <= self._limit_arcsec).astype(np.float32)
        if high_arcsec is None or not self._limited.size:
            return within
        middle = sizes[:, self._limited]
        high = self._prepared_limited.sizes_arcsec(high_arcsec)
        with np.errstate(divide="ignore", invalid="ignore"):
            sigmas = np.log(self._limit_arcsec[:, self._limited] / middle) / np.log(high / middle)
        chance = normal_share(sigmas)
        # Where the forecast is sure, or there is no airmass, the limit decides alone.
        within[:, self._limited] = np.where(np.isfinite(sigmas), chance, within[:, self._limited])
        return within


def normal_share(sigmas: Singles) -> Singles:
    """Return the share of a normal distribution below so many standard deviations.

    Abramowitz & Stegun 7.1.26, from memory and tested against `math.erf`: good to 1e-7.
    """
    x = np.abs(sigmas) / np.sqrt(2.0)
    t = 1.0 / (1.0 + 0.3275911 * x)
    series = ((((1.061405429 * t - 1.453152027) * t) + 1.421413741) * t - 0.284496736) * t
    above = 0.5 * (series + 0.254829592) * t * np.exp(-x * x)
    share: Singles = np.where(sigmas >= 0.0, 1.0 - above, above).astype(np.float32)
    return share
