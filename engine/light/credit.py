"""What an exposure is worth against the plan's reference conditions: its credit.

Sky-limited work: the time needed for a given depth goes as FWHM^2 x sky x 10^(0.8 dm). The credit
of an exposure is the inverse of that ratio: in 2.4 arcsec instead of 1.4 it is worth a third.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import ArrayLike, NDArray

if TYPE_CHECKING:
    from engine.image import ImageModel
    from engine.logbook import Filter, Observatory

# A plan is made for ordinary conditions; much better ones save time, but not without end: read
# noise and the star's own light begin to count. Common practice, no source.
CREDIT_CEILING = 2.0
# The airmass that an ordinary plan meets on average: common practice, no source.
REFERENCE_AIRMASS = 1.2


@dataclass(frozen=True, slots=True)
class Reference:
    """The conditions a plan is made for: image size (arcsec), sky (mag/arcsec2), airmass."""

    image_size_arcsec: float
    sky_mag_arcsec2: float
    airmass: float

    @classmethod
    def of(cls, observatory: Observatory, model: ImageModel, filter_index: int) -> Reference:
        """Return a filter's reference: the site's typical seeing, dark zenith sky, airmass 1.2."""
        filter_ = observatory.filters[filter_index]
        size = model.size_arcsec(filter_index, observatory.seeing.typical_arcsec, REFERENCE_AIRMASS)
        return cls(float(size), filter_.dark_sky_mag, REFERENCE_AIRMASS)


def credit(
    image_size_arcsec: ArrayLike,
    sky_mag_arcsec2: ArrayLike,
    airmass: ArrayLike,
    filter_: Filter,
    reference: Reference,
    *,
    cloud_mag: ArrayLike = 0.0,
) -> NDArray[np.floating]:
    """Return what a second is worth against the reference: 0 to 2, arrays broadcast.

    (FWHM_ref / FWHM)^2 x 10^(0.4 (sky - sky_ref)) x 10^(-0.8 (k (X - X_ref) + cloud)); NaN where
    any input is. ``cloud_mag`` is what thin cloud takes from the star; that it may brighten the
    sky as well is for ``sky_mag_arcsec2`` to say. Right for faint stars on a sky-limited exposure:
    a bright star loses less in poor images than this says.
    """
    return depth_share(
        image_size_arcsec,
        clear_share(sky_mag_arcsec2, airmass, filter_, reference, cloud_mag),
        reference,
    )


def clear_share(
    sky_mag_arcsec2: ArrayLike,
    airmass: ArrayLike,
    filter_: Filter,
    reference: Reference,
    cloud_mag: ArrayLike = 0.0,
) -> NDArray[np.floating]:
    """Return the part of the credit that is not the image's: sky and extinction, without ceiling.

    It holds for the whole night whatever the seeing, so tables keep it.
    """
    darker = 0.4 * (np.asarray(sky_mag_arcsec2) - reference.sky_mag_arcsec2)
    dimmer = filter_.extinction_mag * (np.asarray(airmass) - reference.airmass)
    return np.asarray(10.0 ** (darker - 0.8 * (dimmer + np.asarray(cloud_mag))))


def depth_share(
    image_size_arcsec: ArrayLike, clear: ArrayLike, reference: Reference
) -> NDArray[np.floating]:
    """Return the credit from an image size (arcsec) and what `clear_share` gave; broadcast."""
    sharper = (reference.image_size_arcsec / np.asarray(image_size_arcsec)) ** 2
    return np.asarray(np.minimum(sharper * np.asarray(clear), CREDIT_CEILING))
