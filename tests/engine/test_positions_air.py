"""Refraction and airmass: what must hold at every altitude, in every air."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.positions import (
    AIRMASS_MODELS,
    Air,
    airmass,
    apparent_altitude_deg,
    effective_airmass,
    refraction_deg,
    skyline_altitude_deg,
    standard_pressure_hpa,
    true_altitude_deg,
)
from engine.positions.refraction import (
    HANDOVER_DEG,
    air_factor,
    constants_rad,
    constants_refraction_deg,
    saemundsson_arcmin,
)

ALL_ALTITUDES_DEG = np.linspace(-90.0, 90.0, 3601)
SEA_LEVEL = Air.standard(0.0)

# From a high plateau in summer to the coldest night at the lowest place that is worked from.
airs = st.builds(
    Air,
    pressure_hpa=st.floats(400.0, 1070.0),
    temperature_c=st.floats(-50.0, 45.0),
    humidity_percent=st.floats(0.0, 100.0),
)
models = st.sampled_from(sorted(AIRMASS_MODELS))


@settings(derandomize=True, deadline=None)
@given(air=airs)
def test_what_is_seen_rises_with_what_is(air: Air) -> None:
    seen_deg = apparent_altitude_deg(ALL_ALTITUDES_DEG, air)
    assert np.all(np.diff(seen_deg) > 0.0)
    assert np.all(np.abs(seen_deg) <= 90.0)


@settings(derandomize=True, deadline=None)
@given(air=airs)
def test_refraction_falls_from_the_horizon_up(air: Air) -> None:
    lift_deg = refraction_deg(ALL_ALTITUDES_DEG, air)
    assert np.all(lift_deg >= 0.0)
    assert np.all(np.diff(lift_deg[ALL_ALTITUDES_DEG >= -1.0]) <= 0.0)
    assert float(lift_deg[0]) == 0.0


@settings(derandomize=True, deadline=None)
@given(air=airs)
def test_the_way_back_is_exact(air: Air) -> None:
    """To 0.01 arcsec, at every altitude that can be seen."""
    seen_deg = apparent_altitude_deg(ALL_ALTITUDES_DEG, air)
    assert true_altitude_deg(seen_deg, air) == pytest.approx(ALL_ALTITUDES_DEG, abs=0.01 / 3600.0)


@settings(derandomize=True, deadline=None)
@given(air=airs)
def test_constants_are_of_the_apparent_zenith_distance(air: Air) -> None:
    """One Newton step from the true one is enough: 0.05 arcsec at 10 deg, nothing high up."""
    a_rad, b_rad = constants_rad(air)
    seen_deg = np.linspace(10.0, 90.0, 161)
    tan_z = np.tan(np.deg2rad(90.0 - seen_deg))
    expected_deg = np.rad2deg(a_rad * tan_z + b_rad * tan_z**3)
    found_deg = constants_refraction_deg(seen_deg - expected_deg, air)
    apart_arcsec = 3600.0 * np.abs(found_deg - expected_deg)
    assert float(apart_arcsec.max()) < 0.05
    assert float(apart_arcsec[seen_deg > 30.0].max()) < 0.001


@settings(derandomize=True, deadline=None)
@given(air=airs)
def test_one_model_hands_over_to_the_other_without_a_step(air: Air) -> None:
    fine_deg = np.arange(4.0, 11.0, 0.001)
    lift_arcsec = 3600.0 * refraction_deg(fine_deg, air)
    slopes = np.diff(lift_arcsec) / 0.001
    assert np.all(slopes < 0.0)
    # Nor does the slope, in arcsec per degree, step from one thousandth of a degree to the next.
    assert float(np.abs(np.diff(slopes)).max()) < 0.2
    low, high = (fine_deg <= HANDOVER_DEG[0]), (fine_deg >= HANDOVER_DEG[1])
    lower_arcmin = saemundsson_arcmin(fine_deg[low]) * air_factor(air)
    assert lift_arcsec[low] / 60.0 == pytest.approx(lower_arcmin, rel=1e-12)
    upper_deg = constants_refraction_deg(fine_deg[high], air)
    assert lift_arcsec[high] / 3600.0 == pytest.approx(upper_deg, rel=1e-12)


@settings(derandomize=True, deadline=None)
@given(thin=airs, share=st.floats(1.01, 2.0))
def test_denser_air_lifts_more(thin: Air, share: float) -> None:
    dense = replace(thin, pressure_hpa=thin.pressure_hpa * share)
    cold = replace(thin, temperature_c=thin.temperature_c - 10.0)
    altitudes_deg = np.linspace(0.0, 80.0, 50)
    lift_deg = refraction_deg(altitudes_deg, thin)
    assert np.all(refraction_deg(altitudes_deg, dense) > lift_deg)
    assert np.all(refraction_deg(altitudes_deg, cold) > lift_deg)


def test_nan_stays_nan() -> None:
    mixed_deg = np.array([np.nan, 20.0])
    for values in (
        refraction_deg(mixed_deg, SEA_LEVEL),
        apparent_altitude_deg(mixed_deg, SEA_LEVEL),
        true_altitude_deg(mixed_deg, SEA_LEVEL),
        airmass(mixed_deg),
        effective_airmass(mixed_deg, 1.0, 1.0),
    ):
        assert np.isnan(values[0])
        assert np.isfinite(values[1])


def test_no_air_lifts_nothing() -> None:
    assert np.all(refraction_deg(ALL_ALTITUDES_DEG, Air(pressure_hpa=0.0)) == 0.0)


@pytest.mark.parametrize(
    ("elevation_m", "pressure_hpa"), [(0.0, 1013.25), (1000.0, 898.75), (5000.0, 540.20)]
)
def test_standard_pressure(elevation_m: float, pressure_hpa: float) -> None:
    """U.S. Standard Atmosphere 1976, the table by geopotential height (from memory)."""
    assert standard_pressure_hpa(elevation_m) == pytest.approx(pressure_hpa, abs=0.2)


@settings(derandomize=True, deadline=None)
@given(model=models, air=airs)
def test_airmass_is_a_number_down_to_its_lowest_altitude_and_nan_below(
    model: str, air: Air
) -> None:
    values = airmass(ALL_ALTITUDES_DEG, model, air)
    above = AIRMASS_MODELS[model].lowest_deg <= ALL_ALTITUDES_DEG
    assert np.all(np.isnan(values[~above]))
    assert not np.any(np.isnan(values[above]))


@settings(derandomize=True, deadline=None)
@given(model=models)
def test_airmass_falls_with_altitude_to_one(model: str) -> None:
    values = airmass(np.linspace(AIRMASS_MODELS[model].lowest_deg, 90.0, 901), model)
    assert np.all(values > 0.0)
    # Pickering's and Kasten's touch the zenith with a slope of their own, by some 1e-4.
    assert np.all(np.diff(values) < 1e-5)
    assert float(values[-1]) == pytest.approx(1.0, abs=4e-4)


@pytest.mark.parametrize("model", ["kasten_young", "young", "hardie"])
def test_models_agree_when_each_is_given_its_own_angle(model: str) -> None:
    """Of one apparent altitude all models say the same to 0.4 %, down to 10 deg."""
    altitudes_deg = np.linspace(10.0, 90.0, 81)
    assert airmass(altitudes_deg, model) == pytest.approx(airmass(altitudes_deg), rel=4e-3)


def test_young_is_given_the_true_altitude() -> None:
    """At the horizon the true altitude is half a degree lower; unconverted it would read 32."""
    model = AIRMASS_MODELS["young"]
    assert model.takes == "true"
    expected = float(model.of_altitude(true_altitude_deg(0.0, SEA_LEVEL)))
    assert float(airmass(0.0, "young", SEA_LEVEL)) == pytest.approx(expected, rel=1e-12)
    assert float(airmass(0.0, "young", SEA_LEVEL)) == pytest.approx(38.0, abs=1.0)
    assert float(model.of_altitude(np.array(0.0))) == pytest.approx(31.7, abs=0.1)


def test_thin_air_matters_only_to_a_model_of_the_true_altitude() -> None:
    thin = Air(pressure_hpa=600.0)
    for model in AIRMASS_MODELS.values():
        same = float(airmass(6.0, model.name, thin)) == float(airmass(6.0, model.name, SEA_LEVEL))
        assert same is (model.takes == "apparent")


def test_every_model_has_a_name_and_a_source() -> None:
    for name, model in AIRMASS_MODELS.items():
        assert name == model.name
        assert model.source
    with pytest.raises(KeyError):
        airmass(45.0, "unheard of")


@settings(derandomize=True, deadline=None)
@given(st.floats(1.0, 5.0), st.floats(-1.0, 1.0), st.floats(-0.5, 0.5))
def test_mean_airmass_is_exact_for_a_parabola(middle: float, slope: float, bend: float) -> None:
    """Simpson's rule: over -1 to 1, the mean of a + b t + c t^2 is a + c / 3."""
    start, end = middle - slope + bend, middle + slope + bend
    value = float(effective_airmass(start, middle, end))
    assert value == pytest.approx(middle + bend / 3.0, abs=1e-12)


def test_skyline_closes_through_north() -> None:
    horizon = ((90.0, 10.0), (180.0, 20.0), (350.0, 30.0))
    azimuths_deg = np.array([90.0, 135.0, 350.0, 0.0, 360.0, 40.0, 90.0 + 360.0])
    # From 350 deg (30) down to 90 deg (10) through north is 100 deg: 0.2 deg each.
    expected_deg = np.array([10.0, 15.0, 30.0, 28.0, 28.0, 20.0, 10.0])
    assert skyline_altitude_deg(horizon, azimuths_deg) == pytest.approx(expected_deg, abs=1e-9)


def test_no_skyline_is_a_flat_one() -> None:
    assert np.array_equal(skyline_altitude_deg((), np.ones((2, 3))), np.zeros((2, 3)))
    assert float(skyline_altitude_deg(((120.0, 7.0),), 300.0)) == 7.0
