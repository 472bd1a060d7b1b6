"""The seeing now and in the next hours, from the few values that were measured.

The forecast relaxes from the value now to the level of the night, and its band widens with the gap
since the last measurement, by just as much as is known of each: see `engine.seeing.bank`.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from engine.seeing.bank import MEASUREMENT_ERROR_LN, Bank, Floats
from engine.times import MINUTES_PER_DAY


@dataclass(frozen=True, slots=True)
class SeeingMeasurement:
    """One seeing value: when (UTC MJD), and the zenith FWHM at 500 nm (arcsec).

    ``error_ln`` is its relative error, more than 0.
    """

    mjd: float
    zenith_arcsec: float
    error_ln: float = MEASUREMENT_ERROR_LN


@dataclass(frozen=True, slots=True, eq=False)
class SeeingForecast:
    """What is known of the seeing at one moment, and what follows for later ones.

    ``count`` measurements went in; ``age_min`` is the age of the last, infinite when there is none.
    ``bank`` is the state of the filters at ``now_mjd``.
    """

    now_mjd: float
    count: int
    age_min: float
    bank: Bank

    @property
    def measured(self) -> bool:
        """Whether any measurement went in."""
        return self.count > 0

    @property
    def night_median_arcsec(self) -> float:
        """The level of the night (arcsec), which the forecast relaxes to."""
        return math.exp(float(np.sum(self.bank.weight * self.bank.mean[..., 0])))

    @property
    def now_arcsec(self) -> float:
        """The median of the seeing now (arcsec)."""
        return float(self.at(self.now_mjd)[0])

    def at(self, mjd: ArrayLike) -> tuple[Floats, Floats, Floats]:
        """Return median, low and high (arcsec) of a 68 % band at moments (UTC MJD, any shape).

        Moments before now get the values of now; NaN moments get NaN.
        """
        ahead_min = np.maximum(np.asarray(mjd, dtype=float) - self.now_mjd, 0.0) * MINUTES_PER_DAY
        middle, variance = self.bank.foretold(ahead_min)
        sigma = np.sqrt(variance)
        return np.exp(middle), np.exp(middle - sigma), np.exp(middle + sigma)


def nowcast(
    measurements: Sequence[SeeingMeasurement], now_mjd: float, typical_arcsec: float
) -> SeeingForecast:
    """Return the seeing at a moment (UTC MJD) and its forecast, from measurements up to it.

    Measurements may come in any order; later ones than ``now_mjd`` are left out, and so are values
    that are not positive and finite. ``typical_arcsec`` is the site's usual zenith seeing.
    """
    usable = sorted(
        (m for m in measurements if m.mjd <= now_mjd and 0.0 < m.zenith_arcsec < math.inf),
        key=lambda m: m.mjd,
    )
    bank = Bank.before_any(math.log(typical_arcsec))
    last_mjd = usable[0].mjd if usable else now_mjd
    for each in usable:
        bank = bank.moved_on((each.mjd - last_mjd) * MINUTES_PER_DAY)
        bank = bank.given(math.log(each.zenith_arcsec), each.error_ln)
        last_mjd = each.mjd
    age_min = (now_mjd - last_mjd) * MINUTES_PER_DAY
    return SeeingForecast(
        now_mjd, len(usable), age_min if usable else math.inf, bank.moved_on(age_min)
    )
