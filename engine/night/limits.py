"""The limits that do not depend on the seeing, for every target at every moment at once."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from engine.night.reasons import bit_of
from engine.positions import skyline_altitude_deg

if TYPE_CHECKING:
    from engine.logbook import Target
    from engine.night.tables import Night

Bits = NDArray[np.uint32]
Mask = NDArray[np.bool_]

# The upper limb on the horizon with mean refraction (common practice): the Sun counts as up above.
SUN_UP_ALTITUDE_DEG = -50.0 / 60.0


def limit_bits(night: Night) -> Bits:
    """Return the bits (N, T) of every limit broken; zero where the target may be observed.

    Altitudes are compared as seen, with refraction, because that is where the telescope points.
    """
    observatory, targets = night.observatory, night.targets
    telescope = observatory.telescope
    seen_deg, hour_angle_h = night.apparent_altitude_deg, night.where.hour_angle_h
    least_h, greatest_h = telescope.hour_angle_limits_h
    broken: dict[str, Mask] = {
        "below_horizon": seen_deg <= 0.0,
        "sun_near": (night.sun_separation_deg < observatory.caution.sun_separation_deg)
        & (night.sun.altitude_deg > SUN_UP_ALTITUDE_DEG),
        "daylight": ~_of_each([_any_filter_dark(night, each) for each in targets], seen_deg.shape),
        "skyline": seen_deg
        < skyline_altitude_deg(observatory.site.horizon, night.where.azimuth_deg),
        "too_low": seen_deg < telescope.minimum_altitude_deg,
        "too_high": seen_deg > telescope.maximum_altitude_deg,
        "hour_angle": (hour_angle_h < least_h) | (hour_angle_h > greatest_h),
        "window": ~_of_each([_in_windows(night, each) for each in targets], seen_deg.shape),
        # A target below the horizon has no airmass (NaN): it breaks that limit above already.
        "airmass": night.airmass > _own(targets, "maximum_airmass", np.inf),
        "moon_near": (night.moon_separation_deg < _own(targets, "minimum_moon_separation_deg", 0.0))
        & (night.moon.altitude_deg > 0.0),
    }
    bits = np.zeros(seen_deg.shape, dtype=np.uint32)
    for code, mask in broken.items():
        bits |= np.where(mask, np.uint32(bit_of(code)), np.uint32(0))
    return bits


def _of_each(rows: list[Mask], shape: tuple[int, ...]) -> Mask:
    """Return one row a target as a table (N, T), of no rows too."""
    return np.array(rows, dtype=bool).reshape(shape)


def _own(targets: tuple[Target, ...], name: str, otherwise: float) -> NDArray[np.float64]:
    """Return one optional limit of every target as a column (N, 1)."""
    values = [getattr(target, name) for target in targets]
    return np.array([otherwise if v is None else v for v in values], dtype=float)[:, None]


def _any_filter_dark(night: Night, target: Target) -> Mask:
    wheel = night.observatory
    places = [wheel.filter_index(each.filter) for each in target.exposures]
    return np.asarray(night.dark[places].any(axis=0))


def _in_windows(night: Night, target: Target) -> Mask:
    if not target.windows:
        return np.ones(night.mjd.shape, dtype=bool)
    inside = np.zeros(night.mjd.shape, dtype=bool)
    for begin, end in target.windows_mjd:
        inside |= (night.mjd >= begin) & (night.mjd <= end)
    return inside
