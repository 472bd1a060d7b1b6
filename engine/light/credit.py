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
REFERENCE_AIRMASS = 1.2


@dataclass(frozen=True, slots=True)
class Reference:
    """The conditions a plan is made for: image size (arcsec), sky (mag/arcsec2), airmass."""

    image_size_arcsec: float
    sky_mag_arcsec2: float
    airmass: float

    @classmethod
    def of(cls, observatory: Observatory, model: ImageModel, filter_index: int) -> Reference:
        """Return a filter's reference: the site's typical seeing, dark sky, airmass 1.2."""
        filter_ = observatory.filters[filter_index]
        size = model.size_arcsec(filter_index, observatory.seeing.typical_arcsec, REFERENCE_AIRMASS)
        return cls(float(size), filter_.dark_sky_mag, REFERENCE_AIRMASS)


def credit(
    image_size_arcsec: ArrayLike,
    sky_mag_arcsec2: ArrayLike,
    airmass: ArrayLike,
    filter_: Filter,
    reference: Reference,
) -> NDArray[np.floating]:
    """Return what a second is worth against the reference: 0 to 2, arrays broadcast.

    (FWHM_ref / FWHM)^2 x 10^(0.4 (sky - sky_ref)) x 10^(-0.8 k (X - X_ref)); NaN where any input
    is.
    """
    sharper = (reference.image_size_arcsec / np.asarray(image_size_arcsec)) ** 2
    darker = 0.4 * (np.asarray(sky_mag_arcsec2) - reference.sky_mag_arcsec2)
    clearer = -0.8 * filter_.extinction_mag * (np.asarray(airmass) - reference.airmass)
    return np.minimum(sharper * 10.0 ** (darker + clearer), CREDIT_CEILING)
