"""The seeing forecast: calibrated on simulated nights, steady, and not fooled by one bad frame."""

from __future__ import annotations

import math
from dataclasses import fields, replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.seeing import SeeingMeasurement, nowcast, summary
from engine.seeing.bank import (
    E_FOLDING_MIN,
    LEVEL_DRIFT_LN_PER_SQRT_H,
    LEVEL_SPREAD_LN,
    MEASUREMENT_ERROR_LN,
    SPREAD_LN,
    Bank,
    _merged,
    _updated,
)
from tests.engine.seeing_nights import START_MJD, NightKind, mjd_at, scores

TYPICAL = 1.6


def every(minutes: float, values: list[float], start_min: float = 0.0) -> list[SeeingMeasurement]:
    """Return measurements at equal steps."""
    return [
        SeeingMeasurement(mjd_at(start_min + minutes * place), value)
        for place, value in enumerate(values)
    ]


@pytest.mark.parametrize(
    "kind",
    [
        NightKind(),
        NightKind(bad_share=0.05),
        NightKind(spread_ln=0.26),
        NightKind(spread_ln=0.48),
        NightKind(e_folding_min=12.0),
        NightKind(e_folding_min=22.0),
    ],
    ids=["as assumed", "bad frames", "less spread", "more spread", "shorter", "longer"],
)
def test_band_and_error_on_simulated_nights(kind: NightKind) -> None:
    """A share is known to 1.5 % from 300 nights of 3 moments, to 2.5 % from 120."""
    as_assumed = kind == NightKind()
    found = scores(kind, nights=300 if as_assumed else 120, asked=3, seed=7)
    low, high = (0.63, 0.73) if as_assumed else (0.59, 0.79)
    for horizon, score in found.items():
        assert low <= score.coverage <= high, f"{horizon} min: {score.coverage:.3f}"
        ours, last, median = score.rms()
        assert ours < last, f"{horizon} min"
        assert ours < median, f"{horizon} min"


def test_agrees_with_the_covariance_written_out() -> None:
    """The filter against Gaussian regression: the same model without any recursion."""
    chance = np.random.default_rng(3)
    minutes = np.sort(chance.uniform(0.0, 300.0, 25))
    values = math.log(TYPICAL) + chance.normal(0.0, 0.4, 25)
    ask = np.array([310.0, 325.0, 400.0])

    def covariance(a: np.ndarray, b: np.ndarray) -> np.ndarray:
        shared = np.minimum(a[:, None], b[None, :]) - minutes[0]
        apart = np.abs(a[:, None] - b[None, :])
        return np.asarray(
            LEVEL_SPREAD_LN**2
            + LEVEL_DRIFT_LN_PER_SQRT_H**2 * shared / 60.0
            + SPREAD_LN**2 * np.exp(-apart / E_FOLDING_MIN)
        )

    seen = covariance(minutes, minutes) + MEASUREMENT_ERROR_LN**2 * np.eye(25)
    across = covariance(ask, minutes)
    expected = math.log(TYPICAL) + across @ np.linalg.solve(seen, values - math.log(TYPICAL))
    spread = covariance(ask, ask) - across @ np.linalg.solve(seen, across.T)

    bank = only_as_published(Bank.before_any(math.log(TYPICAL)))
    before = minutes[0]
    for minute, value in zip(minutes, values, strict=True):
        bank = bank.moved_on(minute - before)
        _, mean, variances = _updated(bank.mean, bank.covariance, value, MEASUREMENT_ERROR_LN)
        bank = replace(bank, mean=mean, covariance=variances)
        before = minute
    middle, variance = bank.foretold(ask - before)
    assert middle == pytest.approx(expected, abs=1e-9)
    assert variance == pytest.approx(np.diag(spread), abs=1e-9)


def only_as_published(bank: Bank) -> Bank:
    """Return the one filter with the published spread and time."""
    chosen = np.flatnonzero((bank.spread_ln == SPREAD_LN) & (bank.e_folding_min == E_FOLDING_MIN))
    assert chosen.size == 1
    only = Bank(*(getattr(bank, each.name)[chosen] for each in fields(bank)))
    return replace(only, weight=np.array([[1.0, 0.0]]))


def test_two_answers_become_one_with_their_mean_and_spread() -> None:
    """Against the moments of values drawn from both."""
    chance = np.random.default_rng(9)
    weight = np.array([[0.3, 0.7]])
    mean = np.array([[[0.5, 0.1], [-0.2, 0.4]]])
    covariance = np.array([[[[0.04, -0.01], [-0.01, 0.09]], [[0.02, 0.0], [0.0, 0.01]]]])
    total, middle, spread = _merged(weight, mean, covariance)
    drawn = np.concatenate(
        [
            chance.multivariate_normal(mean[0, place], covariance[0, place], count)
            for place, count in enumerate((60_000, 140_000))
        ]
    )
    assert total == pytest.approx([1.0])
    assert middle[0] == pytest.approx(drawn.mean(axis=0), abs=0.003)
    assert spread[0] == pytest.approx(np.cov(drawn.T), abs=0.003)


def test_a_night_may_change_its_manners() -> None:
    """Three steady hours, then a lively one: the bank believes in a larger spread again."""
    chance = np.random.default_rng(4)
    steady = [1.3] * 180
    lively = [1.3 * math.exp(0.45 * each) for each in chance.normal(size=12)]

    def believed_spread_ln(measured: list[SeeingMeasurement]) -> float:
        bank = nowcast(measured, measured[-1].mjd, TYPICAL).bank
        return float(np.sum(bank.weight * bank.spread_ln))

    calm = every(1.0, steady)
    assert believed_spread_ln(calm) < 0.16
    assert believed_spread_ln([*calm, *every(10.0, lively, start_min=190.0)]) > 0.3


def test_before_any_measurement_the_usual_value_with_a_wide_band() -> None:
    forecast = nowcast([], START_MJD, TYPICAL)
    assert not forecast.measured
    assert math.isinf(forecast.age_min)
    middle, low, high = forecast.at(START_MJD)
    assert middle == pytest.approx(TYPICAL)
    assert low < TYPICAL / 1.6
    assert high > TYPICAL * 1.6


def test_band_widens_and_median_relaxes_to_the_level() -> None:
    forecast = nowcast(every(5.0, [1.2] * 30 + [1.9] * 3), mjd_at(160.0), TYPICAL)
    ahead = mjd_at(160.0) + np.array([0.0, 5.0, 15.0, 30.0, 60.0, 600.0]) / 1440.0
    middle, low, high = forecast.at(ahead)
    assert np.all(np.diff(np.log(high / low)) > 0.0)
    assert np.all(np.diff(middle) < 0.0)
    assert middle[0] > 1.6
    assert middle[-1] == pytest.approx(forecast.night_median_arcsec, rel=0.01)
    # Three of thirty-three steady values: a night that wanders, or one that has changed for good?
    assert 1.25 < forecast.night_median_arcsec < 1.7


@pytest.mark.parametrize("gap_min", [2.0, 5.0])
def test_one_bad_measurement_moves_little(gap_min: float) -> None:
    """A trailed frame three times too large: without it the seeing is 1.2 arcsec."""
    calm = [1.2, 1.25, 1.15, 1.2, 1.22, 1.18] * 3
    now = mjd_at(gap_min * len(calm))
    before = nowcast(every(gap_min, calm), now, TYPICAL).now_arcsec
    after = nowcast(every(gap_min, [*calm, 3.6]), now, TYPICAL)
    assert after.now_arcsec == pytest.approx(before, rel=0.12)
    _, low, high = after.at(now)
    assert low < before < high
    # Two good ones later nothing of it is left.
    later = every(gap_min, [*calm, 3.6, 1.2, 1.2])
    assert nowcast(later, mjd_at(gap_min * 20), TYPICAL).now_arcsec == pytest.approx(1.2, rel=0.05)


@pytest.mark.parametrize("gap_min", [2.0, 5.0, 15.0])
def test_a_lasting_change_is_followed_by_the_third_measurement(gap_min: float) -> None:
    calm = [1.2, 1.25, 1.15, 1.2, 1.22, 1.18] * 3
    changed = every(gap_min, [*calm, 2.3, 2.4, 2.35])
    now = changed[-1].mjd
    assert nowcast(changed, now, TYPICAL).now_arcsec == pytest.approx(2.35, rel=0.08)
    assert nowcast(changed[:-1], changed[-2].mjd, TYPICAL).now_arcsec > 2.0


def test_order_of_measurements_and_later_ones_do_not_matter() -> None:
    measured = every(7.0, [1.4, 1.3, 1.5, 1.6, 1.2])
    now = mjd_at(30.0)
    later = SeeingMeasurement(mjd_at(31.0), 9.0)
    nonsense = [SeeingMeasurement(mjd_at(3.0), value) for value in (0.0, -1.0, math.nan, math.inf)]
    expected = nowcast(measured, now, TYPICAL).at(now)
    assert nowcast([later, *nonsense, *measured[::-1]], now, TYPICAL).at(now) == expected


def test_a_better_measurement_counts_for_more() -> None:
    start = every(10.0, [1.5, 1.5, 1.5])
    now = mjd_at(25.0)
    rough, fine = (
        nowcast([*start, SeeingMeasurement(now, 1.9, error)], now, TYPICAL).now_arcsec
        for error in (0.3, 0.02)
    )
    assert rough < fine == pytest.approx(1.9, rel=0.03)


def test_a_moment_before_now_gets_the_value_of_now_and_nan_gets_nan() -> None:
    forecast = nowcast(every(10.0, [1.5, 1.4]), mjd_at(20.0), TYPICAL)
    middle, low, high = forecast.at([[mjd_at(5.0), mjd_at(20.0), math.nan]])
    assert middle.shape == low.shape == high.shape == (1, 3)
    assert middle[0, 0] == middle[0, 1] == forecast.now_arcsec
    assert np.isnan(middle[0, 2])


@settings(max_examples=80, deadline=None)
@given(
    st.lists(
        st.tuples(st.floats(0.0, 600.0), st.floats(1e-30, 1e30), st.floats(0.01, 0.5)),
        max_size=30,
    ),
    st.floats(0.2, 10.0),
)
def test_any_measurements_give_a_finite_ordered_band(
    drawn: list[tuple[float, float, float]], typical_arcsec: float
) -> None:
    measured = [SeeingMeasurement(mjd_at(at), value, error) for at, value, error in drawn]
    middle, low, high = nowcast(measured, mjd_at(600.0), typical_arcsec).at(
        mjd_at(600.0) + np.linspace(0.0, 0.5, 9)
    )
    assert np.all(np.isfinite(high))
    assert np.all((low > 0.0) & (low < middle) & (middle < high))


def test_summary() -> None:
    assert summary([]) is None
    assert summary([SeeingMeasurement(START_MJD, math.nan)]) is None
    found = summary(every(5.0, [2.0, 1.0, 1.5, 3.0, 1.2]))
    assert found is not None
    assert (found.count, found.best_arcsec, found.worst_arcsec) == (5, 1.0, 3.0)
    quartiles = (found.lower_quartile_arcsec, found.median_arcsec, found.upper_quartile_arcsec)
    assert quartiles == pytest.approx((1.2, 1.5, 2.0))
