"""The skyline of a site: trees, ridges, the edge of the dome."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray


def skyline_altitude_deg(
    horizon: Sequence[tuple[float, float]], azimuth_deg: ArrayLike
) -> NDArray[np.float64]:
    """Return the altitude (deg) of the skyline at azimuths (deg, any shape).

    Straight lines between the given (azimuth, altitude) points, closing on itself through north;
    zero everywhere for a site that gives none.
    """
    azimuths = np.asarray(azimuth_deg, dtype=float)
    if not horizon:
        return np.zeros(azimuths.shape)
    points = np.asarray(horizon, dtype=float)
    return np.asarray(np.interp(azimuths, points[:, 0], points[:, 1], period=360.0))
