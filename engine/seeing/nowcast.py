"""The seeing now and in the next hours, from the few values that were measured.

ln(seeing) is taken as a slow level, different each night, plus a first-order process that forgets
itself in about 17 minutes. A Kalman filter over the measurements gives both with their
uncertainty; the forecast keeps the level and lets the rest die away.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]

# Racine 1996, PASP 108, 372: the ratio of two seeing values grows with an e-folding time of 17 min
# and saturates at a mean of 1.6, which for independent lognormal values is a spread of 0.37.
E_FOLDING_MIN = 17.0
SPREAD_LN = 0.37
# How far a night's level lies from the site's usual one, and how it drifts: common practice, no
# source. Tried on simulated nights in tests/bench/nowcast.py.
LEVEL_SPREAD_LN = 0.30
LEVEL_DRIFT_LN_PER_SQRT_H = 0.08
# Scatter of one FWHM from a few stars on one frame: common practice, no source.
MEASUREMENT_ERROR_LN = 0.08
# Beyond so many standard deviations a measurement is suspect (trailed, out of focus).
SUSPECT_SIGMA = 2.6
# A suspect one counts with its error made so many times larger...
SUSPECT_ERROR = 12.0
# ...unless the one before was suspect as well and the two agree to within so much in ln.
AGREE_LN = 0.25


@dataclass(frozen=True, slots=True)
class SeeingMeasurement:
    """One seeing value: when (UTC MJD), and the zenith FWHM at 500 nm (arcsec)."""

    mjd: float
    zenith_arcsec: float


@dataclass(frozen=True, slots=True)
class SeeingForecast:
    """What is known of the seeing at one moment, and what follows for later ones.

    ``level_ln``, ``wander_ln`` and their covariance describe ln(arcsec) at ``now_mjd``.
    ``measured`` says whether anything but the site's usual value went in; ``age_min`` how old the
    last measurement is (infinite when there is none).
    """

    now_mjd: float
    level_ln: float
    wander_ln: float
    level_var: float
    wander_var: float
    covariance: float
    age_min: float

    @property
    def measured(self) -> bool:
        """Whether any measurement went in."""
        return math.isfinite(self.age_min)

    @property
    def night_median_arcsec(self) -> float:
        """The level of the night (arcsec), which the forecast relaxes to."""
        return math.exp(self.level_ln)

    @property
    def now_arcsec(self) -> float:
        """The median of the seeing now (arcsec)."""
        return math.exp(self.level_ln + self.wander_ln)

    def at(self, mjd: ArrayLike) -> tuple[Floats, Floats, Floats]:
        """Return median, low and high (arcsec) of a 68 % band at moments (UTC MJD, any shape).

        Moments before now get the values of now.
        """
        ahead_min = np.maximum(np.asarray(mjd, dtype=float) - self.now_mjd, 0.0) * MINUTES_PER_DAY
        keep = np.exp(-ahead_min / E_FOLDING_MIN)
        middle = self.level_ln + self.wander_ln * keep
        variance = (
            self.level_var
            + LEVEL_DRIFT_LN_PER_SQRT_H**2 * ahead_min / 60.0
            + self.wander_var * keep**2
            + 2.0 * self.covariance * keep
            + SPREAD_LN**2 * (1.0 - keep**2)
        )
        sigma = np.sqrt(variance)
        return np.exp(middle), np.exp(middle - sigma), np.exp(middle + sigma)


def nowcast(
    measurements: Sequence[SeeingMeasurement], now_mjd: float, typical_arcsec: float
) -> SeeingForecast:
    """Return the seeing at a moment (UTC MJD) and its forecast, from measurements up to it.

    Measurements may come in any order; later ones than ``now_mjd`` are left out, and so are values
    that are not positive. ``typical_arcsec`` is the site's usual zenith seeing.
    """
    usable = sorted(
        (m for m in measurements if m.mjd <= now_mjd and m.zenith_arcsec > 0.0),
        key=lambda m: m.mjd,
    )
    state = _State.before_any(math.log(typical_arcsec))
    suspect_ln: float | None = None
    last_mjd = usable[0].mjd if usable else now_mjd
    for each in usable:
        state = state.moved_on((each.mjd - last_mjd) * MINUTES_PER_DAY)
        last_mjd = each.mjd
        value_ln = math.log(each.zenith_arcsec)
        if not state.suspects(value_ln):
            state, suspect_ln = state.given(value_ln, 1.0), None
        elif suspect_ln is not None and abs(value_ln - suspect_ln) < AGREE_LN:
            # Two in a row that agree: the seeing did change. Believe it from here.
            state, suspect_ln = state.reopened().given(value_ln, 1.0), None
        else:
            state, suspect_ln = state.given(value_ln, SUSPECT_ERROR), value_ln
    state = state.moved_on((now_mjd - last_mjd) * MINUTES_PER_DAY)
    mean, cov = state.mean, state.covariance
    return SeeingForecast(
        now_mjd=now_mjd,
        level_ln=float(mean[0]),
        wander_ln=float(mean[1]),
        level_var=float(cov[0, 0]),
        wander_var=float(cov[1, 1]),
        covariance=float(cov[0, 1]),
        age_min=(now_mjd - last_mjd) * MINUTES_PER_DAY if usable else math.inf,
    )


@dataclass(frozen=True, slots=True)
class _State:
    """Mean and covariance of (level, wander) in ln(arcsec)."""

    mean: Floats
    covariance: Floats

    @classmethod
    def before_any(cls, typical_ln: float) -> _State:
        return cls(np.array([typical_ln, 0.0]), np.diag([LEVEL_SPREAD_LN**2, SPREAD_LN**2]))

    def moved_on(self, minutes: float) -> _State:
        keep = math.exp(-minutes / E_FOLDING_MIN)
        step = np.diag([1.0, keep])
        noise = np.diag(
            [LEVEL_DRIFT_LN_PER_SQRT_H**2 * minutes / 60.0, SPREAD_LN**2 * (1.0 - keep**2)]
        )
        return _State(step @ self.mean, step @ self.covariance @ step + noise)

    def suspects(self, value_ln: float) -> bool:
        variance = float(self.covariance.sum()) + MEASUREMENT_ERROR_LN**2
        return abs(value_ln - float(self.mean.sum())) > SUSPECT_SIGMA * math.sqrt(variance)

    def given(self, value_ln: float, error_factor: float) -> _State:
        error = (MEASUREMENT_ERROR_LN * error_factor) ** 2
        across = self.covariance.sum(axis=1)
        gain = across / (float(across.sum()) + error)
        mean = self.mean + gain * (value_ln - float(self.mean.sum()))
        return _State(mean, self.covariance - np.outer(gain, across))

    def reopened(self) -> _State:
        return _State(
            self.mean, self.covariance + np.diag([LEVEL_SPREAD_LN**2 / 4.0, SPREAD_LN**2])
        )


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
    values = [m.zenith_arcsec for m in measurements if m.zenith_arcsec > 0.0]
    if not values:
        return None
    low, quarter, half, three_quarters, high = np.quantile(values, [0.0, 0.25, 0.5, 0.75, 1.0])
    return SeeingSummary(
        len(values), float(low), float(quarter), float(half), float(three_quarters), float(high)
    )
