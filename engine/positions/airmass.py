"""Airmass: several published formulas, each with the one angle it takes.

The formulas differ by what they start from: some from the altitude that is seen (refraction in it),
some from the geometric one. Mixed up, the horizon is wrong by a fifth. So a model says which it
takes, and `airmass` does the conversion itself.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.positions.air import STANDARD_PRESSURE_HPA, Air
from engine.positions.refraction import true_altitude_deg

Floats = NDArray[np.float64]


@dataclass(frozen=True, slots=True)
class AirmassModel:
    """One formula: its function of an altitude (deg), which altitude, its source, its lower end."""

    name: str
    of_altitude: Callable[[Floats], Floats]
    takes: Literal["apparent", "true"]
    source: str
    lowest_deg: float = 0.0


def _pickering(apparent_deg: Floats) -> Floats:
    h = apparent_deg
    return np.asarray(1.0 / np.sin(np.deg2rad(h + 244.0 / (165.0 + 47.0 * h**1.1))))


def _kasten_young(apparent_deg: Floats) -> Floats:
    h = apparent_deg
    return np.asarray(1.0 / (np.sin(np.deg2rad(h)) + 0.50572 * (h + 6.07995) ** -1.6364))


def _young(true_deg: Floats) -> Floats:
    c = np.sin(np.deg2rad(true_deg))
    return np.asarray(
        (1.002432 * c**2 + 0.148386 * c + 0.0096467)
        / (c**3 + 0.149864 * c**2 + 0.0102963 * c + 0.000303978)
    )


def _hardie(apparent_deg: Floats) -> Floats:
    s = 1.0 / np.sin(np.deg2rad(apparent_deg)) - 1.0
    return np.asarray(1.0 + s - 0.0018167 * s - 0.002875 * s**2 - 0.0008083 * s**3)


def _secant(apparent_deg: Floats) -> Floats:
    return np.asarray(1.0 / np.sin(np.deg2rad(apparent_deg)))


AIRMASS_MODELS: dict[str, AirmassModel] = {
    model.name: model
    for model in (
        AirmassModel("pickering", _pickering, "apparent", "Pickering 2002, DIO 12, 3"),
        AirmassModel(
            "kasten_young", _kasten_young, "apparent", "Kasten & Young 1989, Appl. Opt. 28, 4735"
        ),
        AirmassModel("young", _young, "true", "Young 1994, Appl. Opt. 33, 1108"),
        AirmassModel(
            "hardie",
            _hardie,
            "apparent",
            "Hardie 1962, in Astronomical Techniques, p. 180",
            lowest_deg=5.0,  # further down the polynomial turns over and goes negative
        ),
        AirmassModel("secant", _secant, "apparent", "plane parallel atmosphere, sec z"),
    )
}
DEFAULT_MODEL = "pickering"


def airmass(
    apparent_altitude_deg: ArrayLike, model: str = DEFAULT_MODEL, air: Air | None = None
) -> Floats:
    """Return the airmass at an **apparent** altitude (deg, any shape); NaN below the horizon.

    NaN too where a model does not reach down to the horizon, below its ``lowest_deg``.
    ``air`` matters only to a model of the true altitude; the standard air at sea level when None.
    KeyError for a model that is not in `AIRMASS_MODELS`.
    """
    chosen = AIRMASS_MODELS[model]
    altitude_deg = np.asarray(apparent_altitude_deg, dtype=float)
    above = altitude_deg >= chosen.lowest_deg
    # The formulas are evaluated at the zenith where there is no airmass, so that none can fail.
    held_deg = np.where(above, altitude_deg, 90.0)
    if chosen.takes == "true":
        held_deg = true_altitude_deg(held_deg, air or Air(STANDARD_PRESSURE_HPA))
    with np.errstate(divide="ignore"):
        values = chosen.of_altitude(held_deg)
    return np.asarray(np.where(above, values, np.nan))


def effective_airmass(at_start: ArrayLike, at_middle: ArrayLike, at_end: ArrayLike) -> Floats:
    """Return the mean airmass of an exposure, (X1 + 4 Xm + X2) / 6 (Stetson 1988)."""
    first, middle, last = (np.asarray(x, dtype=float) for x in (at_start, at_middle, at_end))
    return np.asarray((first + 4.0 * middle + last) / 6.0)
