"""Surface brightness as a number that can be added: magnitudes and nanolamberts."""

from __future__ import annotations

import numpy as np
from numpy.typing import ArrayLike, NDArray

# Garstang 1986, eq. 19; Krisciunas & Schaefer 1991, eq. 1. Made for V; in other bands it is a
# linear scale of that band's own, which is all that adding needs.
_SCALE_NL = 34.08
_OFFSET = 20.7233
_PER_MAG = 0.92104


def nanolambert(mag_arcsec2: ArrayLike) -> NDArray[np.floating]:
    """Return brightness (nL) of a magnitude per square arcsecond: 34.08 exp(20.7233 - 0.92104 m).

    Any shape; single precision stays so.
    """
    return np.asarray(_SCALE_NL * np.exp(_OFFSET - _PER_MAG * np.asarray(mag_arcsec2)))


def magnitude(brightness_nl: ArrayLike) -> NDArray[np.floating]:
    """Return the magnitude per square arcsecond of a brightness (nL), the inverse of the above."""
    return np.asarray((_OFFSET - np.log(np.asarray(brightness_nl) / _SCALE_NL)) / _PER_MAG)
