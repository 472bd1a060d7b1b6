"""The air above the site: what refraction and dispersion depend on."""

from __future__ import annotations

from dataclasses import dataclass

STANDARD_PRESSURE_HPA = 1013.25


def standard_pressure_hpa(elevation_m: float) -> float:
    """Return the pressure (hPa) of the standard atmosphere at a height above the sea (m).

    P = 1013.25 (1 - 2.25577e-5 h)^5.25588, the troposphere of the U.S. Standard Atmosphere 1976.
    """
    return float(STANDARD_PRESSURE_HPA * (1.0 - 2.25577e-5 * elevation_m) ** 5.25588)


@dataclass(frozen=True, slots=True)
class Air:
    """Pressure (hPa), temperature (deg C) and relative humidity (percent) at the telescope."""

    pressure_hpa: float
    temperature_c: float = 10.0
    humidity_percent: float = 50.0

    @classmethod
    def standard(cls, elevation_m: float) -> Air:
        """Return the air to assume at a height (m) until something is measured."""
        return cls(pressure_hpa=standard_pressure_hpa(elevation_m))
