"""Invented weather for a rehearsal: seeing that wanders, a cloud that passes, air that cools.

Nothing here is a model of a real site; the seeing alone follows published statistics, so that the
forecast is tried on the kind of night it was made for.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.times import MINUTES_PER_DAY

# First-order process in ln(seeing): e-folding about 17 min, spread about 0.37 in free air
# (Racine 1996, PASP 108, 372). A little less spread here, since the level moves as well.
E_FOLDING_MIN = 17.0
SPREAD_LN = 0.22


@dataclass(frozen=True, slots=True)
class InventedNight:
    """The truth behind a rehearsed night, on a one-minute grid ``mjd`` (T,), UTC.

    ``seeing_arcsec`` (T,) is at the zenith and 500 nm; the cloud lies between two moments.
    """

    mjd: NDArray[np.float64]
    seeing_arcsec: NDArray[np.float64]
    cloud_begin_mjd: float
    cloud_end_mjd: float

    def seeing_at(self, mjd: float) -> float:
        """Return the true zenith seeing (arcsec), held at the ends of the night."""
        return float(np.interp(mjd, self.mjd, self.seeing_arcsec))

    def is_cloudy(self, mjd: float) -> bool:
        """Say whether the cloud is over the telescope."""
        return self.cloud_begin_mjd <= mjd < self.cloud_end_mjd

    def air_at(self, mjd: float) -> tuple[float, float, float]:
        """Return temperature (deg C), relative humidity (percent) and wind (m/s)."""
        share = float((mjd - self.mjd[0]) / (self.mjd[-1] - self.mjd[0]))
        temperature_c = 17.5 - 6.0 * share
        humidity_percent = 48.0 + 26.0 * share
        wind_m_per_s = 4.0 + 2.5 * float(np.sin(5.0 * share))
        return temperature_c, humidity_percent, wind_m_per_s


def invent_night(
    begin_mjd: float, end_mjd: float, typical_arcsec: float, seed: int
) -> InventedNight:
    """Return an invented night between two moments (UTC MJD), the same for the same seed.

    The seeing wanders about a level near the site's typical value (arcsec) that worsens by a
    third in the middle of the night and half recovers; a cloud takes 25 to 45 minutes somewhere
    in the second quarter.
    """
    chance = np.random.default_rng(seed)
    minutes = max(round((end_mjd - begin_mjd) * MINUTES_PER_DAY), 2)
    mjd = begin_mjd + np.arange(minutes) / MINUTES_PER_DAY
    keep = np.exp(-1.0 / E_FOLDING_MIN)
    kicks = chance.normal(0.0, SPREAD_LN * np.sqrt(1.0 - keep**2), minutes)
    wander = np.empty(minutes)
    wander[0] = chance.normal(0.0, SPREAD_LN)
    for minute in range(1, minutes):
        wander[minute] = keep * wander[minute - 1] + kicks[minute]
    share = np.linspace(0.0, 1.0, minutes)
    worse = 0.33 / (1.0 + np.exp(-(share - 0.45) / 0.03)) - 0.17 / (
        1.0 + np.exp(-(share - 0.75) / 0.05)
    )
    level = np.log(typical_arcsec) + chance.normal(-0.1, 0.08) + worse
    cloud_begin = begin_mjd + (end_mjd - begin_mjd) * chance.uniform(0.27, 0.4)
    return InventedNight(
        mjd=mjd,
        seeing_arcsec=np.exp(level + wander),
        cloud_begin_mjd=cloud_begin,
        cloud_end_mjd=cloud_begin + chance.uniform(25.0, 45.0) / MINUTES_PER_DAY,
    )
