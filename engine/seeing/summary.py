"""The seeing of a night in a few numbers."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from engine.seeing.nowcast import SeeingMeasurement


@dataclass(frozen=True, slots=True)
class SeeingSummary:
    """A night's measured seeing in a few numbers, zenith at 500 nm (arcsec)."""

    count: int
    best_arcsec: float
    lower_quartile_arcsec: float
    median_arcsec: float
    upper_quartile_arcsec: float
    worst_arcsec: float


def summary(measurements: Sequence[SeeingMeasurement]) -> SeeingSummary | None:
    """Return a summary of measurements, or None when there are none."""
    values = [m.zenith_arcsec for m in measurements if 0.0 < m.zenith_arcsec < math.inf]
    if not values:
        return None
    low, quarter, half, three_quarters, high = np.quantile(values, [0.0, 0.25, 0.5, 0.75, 1.0])
    return SeeingSummary(
        len(values), float(low), float(quarter), float(half), float(three_quarters), float(high)
    )
