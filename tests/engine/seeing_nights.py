"""Simulated nights with known seeing, and how well a forecast does on them.

The truth is drawn from its own grid of minutes, step by step, and knows nothing of the filter.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass, field

import numpy as np
from numpy.typing import NDArray

from engine.seeing import SeeingMeasurement, nowcast
from engine.times import MINUTES_PER_DAY

START_MJD = 61478.4
NIGHT_MIN = 540
TYPICAL_ARCSEC = 1.6
HORIZONS_MIN = (0, 10, 20, 30, 60)


@dataclass(frozen=True, slots=True)
class NightKind:
    """What nights are drawn from, and how they are measured. Spreads and errors are in ln."""

    spread_ln: float = 0.37
    e_folding_min: float = 17.0
    level_spread_ln: float = 0.45
    drift_ln_per_sqrt_h: float = 0.0
    error_ln: float = 0.08
    mean_gap_min: float = 8.0
    bad_share: float = 0.0


@dataclass(frozen=True, slots=True)
class DrawnNight:
    """The true ln(arcsec) at every minute (T,), and what was measured of it."""

    truth_ln: NDArray[np.float64]
    measurements: list[SeeingMeasurement]


def mjd_at(minute: float) -> float:
    """Return the UTC MJD of a minute of the night."""
    return START_MJD + minute / MINUTES_PER_DAY


def draw_night(kind: NightKind, chance: np.random.Generator) -> DrawnNight:
    """Return one night; bad measurements are too large by a factor of 1.4 to 3."""
    keep = math.exp(-1.0 / kind.e_folding_min)
    kicks = chance.normal(0.0, kind.spread_ln * math.sqrt(1.0 - keep**2), NIGHT_MIN)
    wander = np.empty(NIGHT_MIN)
    wander[0] = chance.normal(0.0, kind.spread_ln)
    for minute in range(1, NIGHT_MIN):
        wander[minute] = keep * wander[minute - 1] + kicks[minute]
    drift = np.cumsum(chance.normal(0.0, kind.drift_ln_per_sqrt_h / math.sqrt(60.0), NIGHT_MIN))
    level = math.log(TYPICAL_ARCSEC) + chance.normal(0.0, kind.level_spread_ln)
    truth = level + drift + wander
    measurements, at = [], chance.exponential(kind.mean_gap_min)
    while at < NIGHT_MIN - 1:
        value = truth[round(at)] + chance.normal(0.0, kind.error_ln)
        if chance.random() < kind.bad_share:
            value += math.log(chance.uniform(1.4, 3.0))
        measurements.append(SeeingMeasurement(mjd_at(round(at)), math.exp(value)))
        at += 1.0 + chance.exponential(kind.mean_gap_min - 1.0)
    return DrawnNight(truth, measurements)


@dataclass(slots=True)
class Score:
    """Errors in ln at one horizon, and whether the band held the truth."""

    ours: list[float] = field(default_factory=list)
    last_value: list[float] = field(default_factory=list)
    night_median: list[float] = field(default_factory=list)
    held: list[bool] = field(default_factory=list)

    @property
    def coverage(self) -> float:
        """Share of truths inside the 68 % band."""
        return float(np.mean(self.held))

    def rms(self) -> tuple[float, float, float]:
        """Return rms ln error of the forecast, the last value, the median of the night so far."""
        ours, last, median = (
            float(np.sqrt(np.mean(np.square(each))))
            for each in (self.ours, self.last_value, self.night_median)
        )
        return ours, last, median


def moments(chance: np.random.Generator, count: int) -> Iterator[int]:
    """Yield random minutes at which to ask: an hour and more from the start and to the end."""
    yield from (int(each) for each in chance.integers(60, NIGHT_MIN - 61, count))


def scores(kind: NightKind, *, nights: int, asked: int, seed: int) -> dict[int, Score]:
    """Return a score for every horizon (min) from so many nights, each asked so many times."""
    chance = np.random.default_rng(seed)
    found = {horizon: Score() for horizon in HORIZONS_MIN}
    for _ in range(nights):
        night = draw_night(kind, chance)
        for minute in moments(chance, asked):
            known = [each for each in night.measurements if each.mjd <= mjd_at(minute)]
            if not known:
                continue
            last_ln = math.log(known[-1].zenith_arcsec)
            median_ln = float(np.median(np.log([each.zenith_arcsec for each in known])))
            forecast = nowcast(known, mjd_at(minute), TYPICAL_ARCSEC)
            middle, low, high = forecast.at([mjd_at(minute + each) for each in HORIZONS_MIN])
            for place, horizon in enumerate(HORIZONS_MIN):
                truth_ln = night.truth_ln[minute + horizon]
                score = found[horizon]
                score.ours.append(math.log(middle[place]) - truth_ln)
                score.last_value.append(last_ln - truth_ln)
                score.night_median.append(median_ln - truth_ln)
                score.held.append(bool(low[place] <= math.exp(truth_ln) <= high[place]))
    return found
