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

    ``seeing_arcsec`` (T,) is the zenith seeing at 500 nm, ``image_size_arcsec`` (F, N, T) the
    delivered size, ``soft`` (F, N, T) where that is above the target's own limit, ``quality``
    (F, N, T) what a second there is worth against the plan's reference conditions; 0 where
    there is no airmass.
    """

    seeing_arcsec: NDArray[np.float64]
    image_size_arcsec: Singles
    soft: NDArray[np.bool_]
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

    def given(self, seeing_arcsec: NDArray[np.float64]) -> Outlook:
        """Return the outlook for a zenith seeing (T,) at 500 nm, in arcsec."""
        sizes = self._prepared.sizes_arcsec(seeing_arcsec)
        quality = np.stack(
            [
                depth_share(size, clear, reference)
                for size, clear, reference in zip(sizes, self._clear, self._references, strict=True)
            ]
        ).astype(np.float32)
        return Outlook(
            seeing_arcsec=seeing_arcsec,
            image_size_arcsec=sizes,
            soft=sizes > self._limit_arcsec,
            quality=np.nan_to_num(quality, nan=0.0),
        )
