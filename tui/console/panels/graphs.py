"""The night's tables as graphs take them: sampled over the width, with their axes."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.night import Night
from engine.positions import airmass, skyline_altitude_deg
from engine.watch import Watch
from tui.console.panels.local import local
from tui.paint.night_axis import NightAxis

# Two a cell on the widest screens.
SAMPLES = 400
AIRMASS_MARKS = (1.1, 1.2, 1.5, 2.0, 3.0, 5.0)
_ALTITUDES_DEG = np.linspace(1.0, 90.0, 891)

Floats = NDArray[np.float64]


def picks(night: Night, samples: int = SAMPLES) -> NDArray[np.int64]:
    """Return places in the night's grid at even steps over a graph's width."""
    return np.linspace(0, night.last, samples).round().astype(np.int64)


def night_axis(watch: Watch) -> NightAxis:
    """Return the hours of the night's tables, from their first minute to their last."""
    night = watch.planner.night
    begin_mjd, end_mjd = float(night.mjd[0]), float(night.mjd[-1])
    begin = local(watch, begin_mjd)
    sun = night.sun.altitude_deg[picks(night)]
    dark = (sun <= -50.0 / 60.0).astype(int) + (sun <= -6.0) + (sun <= -12.0) + (sun <= -18.0)
    return NightAxis(
        hours=(end_mjd - begin_mjd) * 24.0,
        begin_hour=begin.hour + begin.minute / 60.0,
        now_h=(watch.clock.now_mjd() - begin_mjd) * 24.0,
        dark=dark.tolist(),
    )


def share_of(night: Night, mjd: float) -> float:
    """Return where a moment (UTC MJD) stands over a graph's width, 0 to 1."""
    return float((mjd - night.mjd[0]) / (night.mjd[-1] - night.mjd[0]))


def airmass_marks(night: Night) -> tuple[tuple[float, str], ...]:
    """Return round airmasses with the altitudes (deg) at which they stand."""
    return tuple((_altitude_of(night, each), f"{each:.1f}") for each in AIRMASS_MARKS)


def lowest_deg(night: Night, index: int) -> Floats:
    """Return the lowest altitude (T,) at which a target may be observed, as seen.

    The highest of the site's skyline in its direction, the telescope's limit and its own airmass.
    """
    observatory, own = night.observatory, night.targets[index].maximum_airmass
    skyline = skyline_altitude_deg(observatory.site.horizon, night.where.azimuth_deg[index])
    lowest = np.maximum(skyline, observatory.telescope.minimum_altitude_deg)
    return np.maximum(lowest, _altitude_of(night, own)) if own else lowest


def _altitude_of(night: Night, mass: float) -> float:
    """Return the altitude (deg), as seen, of an airmass."""
    masses = airmass(_ALTITUDES_DEG, night.observatory.site.airmass_model, night.air)
    return float(np.interp(-mass, -masses, _ALTITUDES_DEG))
