"""A bank of Kalman filters over ln(seeing), in step with each other.

ln(seeing) is taken as the sum of two things: a level that belongs to the night, and a first-order
process that forgets itself in about a quarter of an hour. Neither is seen alone. Values close
together tell the sum; only many, spread over much more than the forgetting time, tell them apart.
So each filter carries both with their covariance.

Two more things are not known and are estimated along the way:

* how lively this night is. There is a filter for each pair of spread and forgetting time, weighted
  by how well it has foretold the measurements so far;
* whether a surprising measurement is bad (a trailed or unfocused frame says nothing about the
  seeing) or the seeing has truly changed. Each filter carries both answers for the last
  measurement: one bad value has little weight, and when the next one or two agree with it, the
  answer "it was real" wins and the change is followed.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

# Racine 1996, PASP 108, 372: the ratio of two seeing values grows with an e-folding time of 17 min
# and saturates at a mean of 1.6, which for independent lognormal values is a spread of 0.37.
E_FOLDING_MIN = 17.0
SPREAD_LN = 0.37
# Mean 0.76 and median 0.64 arcsec over years at one site (Munoz-Tunon et al. 1997, A&AS 125, 183)
# mean a spread of 0.586 if lognormal; without Racine's 0.37 that leaves 0.45 between nights.
LEVEL_SPREAD_LN = 0.45
# How fast a night's level drifts: common practice, no source.
LEVEL_DRIFT_LN_PER_SQRT_H = 0.08
# Scatter of a FWHM from a few stars on one frame: common practice, no source.
MEASUREMENT_ERROR_LN = 0.08
# One measurement in so many is bad, and then lies anywhere within about a factor of two: common
# practice, no source.
BAD_SHARE = 0.05
BAD_SPREAD_LN = 0.7
# At one measurement in so many the seeing has jumped, half of it for good, half to die away again
# (jumps with slow recovery: Munoz-Tunon et al. 1997); how often and how far: common practice.
JUMP_SHARE = 0.003
JUMP_SPREAD_LN = 0.37
# No filter is ever given up for good, since a steady night may turn lively: with this a dozen
# measurements persuade the bank, and on nights that stay as they are it costs nothing (tried).
LEAST_WEIGHT = 1e-4

# The bank: factors on the published spread and e-folding time, with what is believed of each
# before the night. Racine gives 17 +- 5 min; other sites are not his. Common practice, no source.
_SPREAD_FACTORS = np.array([0.35, 0.5, 0.7, 1.0, 1.4])
_SPREAD_BELIEF = np.array([0.1, 0.15, 0.25, 0.3, 0.2])
_TIME_FACTORS = np.array([0.6, 1.0, 1.7])
_TIME_BELIEF = np.array([0.25, 0.5, 0.25])

_JUMP = JUMP_SPREAD_LN**2 * np.eye(2)
_STEADY_OR_JUMPED = np.repeat([1.0 - BAD_SHARE - JUMP_SHARE, JUMP_SHARE], 2)


@dataclass(frozen=True, slots=True, eq=False)
class Bank:
    """Filters side by side. Shapes: H pairs of spread and forgetting time; last good, last bad.

    ``mean`` (H, 2, 2) and ``covariance`` (H, 2, 2, 2) are of (level, wander) in ln(arcsec);
    ``weight`` (H, 2) sums to 1; ``spread_ln`` and ``e_folding_min`` are (H, 1).
    """

    spread_ln: Floats
    e_folding_min: Floats
    weight: Floats
    mean: Floats
    covariance: Floats

    @classmethod
    def before_any(cls, typical_ln: float) -> Bank:
        """Return the bank before any measurement, around the site's usual ln(arcsec)."""
        spread, time = (
            each.reshape(-1, 1)
            for each in np.meshgrid(
                SPREAD_LN * _SPREAD_FACTORS, E_FOLDING_MIN * _TIME_FACTORS, indexing="ij"
            )
        )
        belief = np.outer(_SPREAD_BELIEF, _TIME_BELIEF).reshape(-1, 1)
        covariance = np.zeros((len(spread), 2, 2, 2))
        covariance[..., 0, 0] = LEVEL_SPREAD_LN**2
        covariance[..., 1, 1] = spread**2
        mean = np.zeros((len(spread), 2, 2))
        mean[..., 0] = typical_ln
        return cls(spread, time, belief * np.array([1.0, 0.0]), mean, covariance)

    def moved_on(self, minutes: float) -> Bank:
        """Return the bank some minutes later, with nothing measured between."""
        keep = np.exp(-minutes / self.e_folding_min)
        step = np.stack([np.ones_like(keep), keep], axis=-1)
        covariance = self.covariance * step[..., :, None] * step[..., None, :]
        covariance[..., 0, 0] += LEVEL_DRIFT_LN_PER_SQRT_H**2 * minutes / 60.0
        covariance[..., 1, 1] += self.spread_ln**2 * (1.0 - keep**2)
        return replace(self, mean=self.mean * step, covariance=covariance)

    def given(self, value_ln: float, error_ln: float) -> Bank:
        """Return the bank with one measurement taken in, ln(arcsec) and its standard error."""
        # Four ways to a good one: last good or bad, and since then steady or jumped.
        likelihood, mean, covariance = _updated(
            np.concatenate([self.mean, self.mean], axis=1),
            np.concatenate([self.covariance, self.covariance + _JUMP], axis=1),
            value_ln,
            error_ln,
        )
        before = np.concatenate([self.weight, self.weight], axis=1) * _STEADY_OR_JUMPED
        good = _merged(before * likelihood, mean, covariance)
        surprise = value_ln - self.mean.sum(axis=-1)
        variance = self.covariance.sum(axis=(-2, -1)) + error_ln**2 + BAD_SPREAD_LN**2
        bad = _merged(
            self.weight * BAD_SHARE * _density(surprise, variance), self.mean, self.covariance
        )
        weight, mean, covariance = (np.stack(pair, axis=1) for pair in zip(good, bad, strict=True))
        weight = np.maximum(weight / weight.sum(), LEAST_WEIGHT)
        return replace(self, weight=weight / weight.sum(), mean=mean, covariance=covariance)

    def foretold(self, ahead_min: Floats) -> tuple[Floats, Floats]:
        """Return mean and variance of ln(arcsec) some minutes ahead (any shape)."""
        ahead = np.asarray(ahead_min)[..., None, None]
        keep = np.exp(-ahead / self.e_folding_min)
        middle = self.mean[..., 0] + self.mean[..., 1] * keep
        variance = (
            self.covariance[..., 0, 0]
            + LEVEL_DRIFT_LN_PER_SQRT_H**2 * ahead / 60.0
            + self.covariance[..., 1, 1] * keep**2
            + 2.0 * self.covariance[..., 0, 1] * keep
            + self.spread_ln**2 * (1.0 - keep**2)
        )
        mean = np.sum(self.weight * middle, axis=(-2, -1))
        apart = (middle - mean[..., None, None]) ** 2
        return mean, np.sum(self.weight * (variance + apart), axis=(-2, -1))


def _updated(
    mean: Floats, covariance: Floats, value_ln: float, error_ln: float
) -> tuple[Floats, Floats, Floats]:
    """Return likelihood (...), mean (..., 2), covariance (..., 2, 2) after a good measurement."""
    across = covariance.sum(axis=-1)
    variance = across.sum(axis=-1) + error_ln**2
    surprise = value_ln - mean.sum(axis=-1)
    gain = across / variance[..., None]
    return (
        _density(surprise, variance),
        mean + gain * surprise[..., None],
        covariance - gain[..., :, None] * across[..., None, :],
    )


def _density(surprise: Floats, variance: Floats) -> Floats:
    """Return the normal density, without the constant that all share."""
    # A value hundreds of spreads away must leave some weight to divide by.
    return np.asarray(np.exp(-0.5 * np.minimum(surprise**2 / variance, 600.0)) / np.sqrt(variance))


def _merged(weight: Floats, mean: Floats, covariance: Floats) -> tuple[Floats, Floats, Floats]:
    """Return one normal distribution (H, ...) with the moments of those along axis 1."""
    total = weight.sum(axis=1)
    share = (weight / total[:, None])[..., None]
    middle = (share * mean).sum(axis=1)
    apart = mean - middle[:, None]
    spread = covariance + apart[..., :, None] * apart[..., None, :]
    return total, middle, (share[..., None] * spread).sum(axis=1)
