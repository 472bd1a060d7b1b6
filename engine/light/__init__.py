"""Light: how bright the sky is, what an exposure will reach, and what it is worth."""

from engine.light.credit import Reference, credit
from engine.light.sky import (
    MOONLIGHT_ACCURACY_PERCENT,
    TWILIGHT_ACCURACY_MAG,
    MoonLight,
    sky_mag_arcsec2,
)

__all__ = [
    "MOONLIGHT_ACCURACY_PERCENT",
    "TWILIGHT_ACCURACY_MAG",
    "MoonLight",
    "Reference",
    "credit",
    "sky_mag_arcsec2",
]
