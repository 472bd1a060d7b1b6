"""Filters and exposure models to try the light room with; nothing in here is a real telescope."""

from __future__ import annotations

from typing import Any

from engine.light import ExposureModel
from engine.logbook import Filter


def a_filter(**changes: Any) -> Filter:
    """Return a V filter with some keys changed."""
    values: dict[str, Any] = {
        "name": "V",
        "wavelength_nm": 550.0,
        "width_nm": 85.0,
        "extinction_mag": 0.16,
        "zero_point_mag": 23.1,
        "dark_sky_mag": 21.6,
    }
    return Filter.model_validate({**values, **changes})


def an_exposure_model(**changes: float) -> ExposureModel:
    """Return the model of a 0.8 m telescope with some values changed."""
    values = {
        "zero_point_mag": 23.1,
        "extinction_mag": 0.16,
        "aperture_m": 0.8,
        "elevation_m": 1165.0,
        "pixel_arcsec": 0.33,
        "read_noise_e": 9.0,
        "dark_e_per_s": 0.02,
        "gain_e_per_adu": 1.5,
        "saturation_adu": 60000.0,
    }
    return ExposureModel(**{**values, **changes})
