"""Light: how bright the sky is, what an exposure will reach, and what it is worth."""

from engine.light.credit import Reference, clear_share, credit, depth_share
from engine.light.exposure import Aperture, Conditions, ExposureModel, Subexposures
from engine.light.flats import (
    decline_from_sun_per_s,
    decline_measured_per_s,
    evening_flat_s,
    morning_flat_s,
)
from engine.light.moonlight import MoonLight
from engine.light.photometry import implied_throughput, zero_point_doubt
from engine.light.scintillation import scintillation_rms
from engine.light.sky import (
    MOONLIGHT_ACCURACY_PERCENT,
    TWILIGHT_ACCURACY_MAG,
    sky_mag_arcsec2,
    sky_mags_arcsec2,
)

__all__ = [
    "MOONLIGHT_ACCURACY_PERCENT",
    "TWILIGHT_ACCURACY_MAG",
    "Aperture",
    "Conditions",
    "ExposureModel",
    "MoonLight",
    "Reference",
    "Subexposures",
    "clear_share",
    "credit",
    "decline_from_sun_per_s",
    "decline_measured_per_s",
    "depth_share",
    "evening_flat_s",
    "implied_throughput",
    "morning_flat_s",
    "scintillation_rms",
    "sky_mag_arcsec2",
    "sky_mags_arcsec2",
    "zero_point_doubt",
]
