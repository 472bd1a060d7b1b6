"""The sky: shapes, horizons, seams, and what must grow with what."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.light import MoonLight, sky_mag_arcsec2, sky_mags_arcsec2
from engine.light.extinction import rayleigh_mag
from engine.light.moonlight import ScatteringShares, lamp
from engine.light.twilight import twilight_nanolambert
from engine.positions import airmass
from tests.engine.light_cases import a_filter

NO_MOON = MoonLight(-30.0, 90.0, 180.0)
NIGHT_SUN_DEG = -30.0
FILTERS = (
    a_filter(name="B", wavelength_nm=438.0, extinction_mag=0.28, dark_sky_mag=22.3),
    a_filter(),
    a_filter(name="I", wavelength_nm=798.0, extinction_mag=0.07, dark_sky_mag=19.6),
)


def v_sky(target_deg: float = 60.0, sun_deg: float = NIGHT_SUN_DEG, **moon: float) -> float:
    """Return the V sky; the Moon is a full one, 40 deg high and 60 deg away, where not told."""
    light = {"altitude_deg": 40.0, "separation_deg": 60.0, "phase_angle_deg": 0.0, **moon}
    return float(
        sky_mag_arcsec2(
            a_filter(),
            altitude_deg=target_deg,
            sun_altitude_deg=sun_deg,
            moon=MoonLight(**light),
        )
    )


def test_shapes_broadcast_and_below_the_horizon_is_no_sky() -> None:
    altitude = np.linspace(-20.0, 90.0, 12).reshape(4, 3)
    moon = MoonLight(np.array([-5.0, 10.0, 50.0]), np.full((4, 3), 70.0), np.full(3, 30.0))
    skies = sky_mags_arcsec2(
        FILTERS, altitude_deg=altitude, sun_altitude_deg=np.full(3, -40.0), moon=moon
    )
    assert skies.shape == (3, 4, 3)
    assert np.array_equal(np.isnan(skies), np.broadcast_to(altitude < 0.0, skies.shape))
    for place, each in enumerate(FILTERS):
        one = sky_mag_arcsec2(
            each, altitude_deg=altitude, sun_altitude_deg=np.full(3, -40.0), moon=moon
        )
        assert np.array_equal(one, skies[place], equal_nan=True)


@settings(deadline=None)
@given(
    st.floats(-90.0, 90.0),
    st.floats(-90.0, 90.0),
    st.floats(-90.0, 90.0),
    st.floats(0.0, 180.0),
    st.floats(0.0, 180.0),
)
def test_every_place_of_target_sun_and_moon_has_a_sky_or_none(
    altitude: float, sun: float, moon: float, separation: float, phase: float
) -> None:
    skies = sky_mags_arcsec2(
        FILTERS,
        altitude_deg=altitude,
        sun_altitude_deg=sun,
        moon=MoonLight(moon, separation, phase),
    )
    assert np.all(np.isfinite(skies)) if altitude >= 0.0 else np.all(np.isnan(skies))
    dark = np.array([each.dark_sky_mag for each in FILTERS])
    if altitude > 30.0:
        assert np.all(skies < dark + 0.001)


def test_nan_gives_nan_without_a_word() -> None:
    for inputs in ((np.nan, -30.0, 10.0), (50.0, np.nan, 10.0), (50.0, -30.0, np.nan)):
        altitude, sun, separation = inputs
        value = sky_mag_arcsec2(
            a_filter(),
            altitude_deg=altitude,
            sun_altitude_deg=sun,
            moon=MoonLight(30.0, separation, 90.0),
        )
        assert np.isnan(value)


def test_single_precision_is_enough_and_stays_single() -> None:
    chance = np.random.default_rng(5)
    altitude, separation = chance.uniform(0.0, 90.0, (2, 40, 60))
    inputs = {
        "altitude_deg": altitude,
        "sun_altitude_deg": np.linspace(-2.0, -30.0, 60),
        "moon": MoonLight(np.linspace(-10.0, 70.0, 60), separation, np.full(60, 20.0)),
    }
    exact = sky_mags_arcsec2(FILTERS, **inputs)
    single = sky_mags_arcsec2(FILTERS, **inputs, precision=np.float32)
    assert single.dtype == np.float32
    assert single == pytest.approx(exact, abs=1e-4)


def test_the_dark_sky_is_the_filters_own_at_the_zenith_and_brighter_lower() -> None:
    skies = [v_sky(altitude, altitude_deg=-30.0) for altitude in (90.0, 60.0, 40.0, 25.0)]
    assert skies[0] == pytest.approx(21.6, abs=1e-6)
    assert np.all(np.diff(skies) < 0.0)
    assert skies[0] - skies[-1] < 1.0


def test_moonlight_grows_with_phase_and_nearness() -> None:
    by_phase = [v_sky(phase_angle_deg=phase) for phase in (0.0, 45.0, 90.0, 135.0)]
    assert np.all(np.diff(by_phase) > 0.3)
    by_separation = [v_sky(separation_deg=each) for each in (5.0, 20.0, 40.0, 60.0, 90.0)]
    assert np.all(np.diff(by_separation) > 0.0)
    assert v_sky(altitude_deg=-0.1) == v_sky(altitude_deg=-60.0)


def test_the_sky_brightens_gradually_at_moonrise() -> None:
    """With eq. 3 as the Moon's airmass a full Moon would come up 2 mag at once."""
    rising = np.array([v_sky(altitude_deg=each) for each in np.arange(-0.5, 25.0, 0.25)])
    steps = -np.diff(rising)
    assert np.all(steps > -1e-3)
    assert steps.max() < 0.3
    assert rising[0] - rising[-1] > 1.5


def test_a_low_moon_is_dimmed_along_its_own_air() -> None:
    """Against one at 20 degrees by the extinction of as many airmasses as it is deeper."""
    deg = np.array([0.5, 5.0, 12.0, 20.0, 45.0, 90.0])
    light = lamp(MoonLight(deg, 60.0, 0.0), 550.0, 0.16)
    assert np.all(np.diff(light) > 0.0)
    deeper = airmass(deg[:3]) - airmass(20.0)
    assert light[:3] / light[3] == pytest.approx(10.0 ** (-0.4 * 0.16 * deeper), rel=1e-6)


def test_no_seam_where_the_low_moon_begins() -> None:
    below, above = (float(lamp(MoonLight(20.0 + d, 60.0, 0.0), 550.0, 0.16)) for d in (-1e-6, 1e-6))
    assert below == pytest.approx(above, rel=1e-6)


@settings(deadline=None)
@given(st.floats(0.12, 1.0), st.floats(500.0, 1030.0))
def test_in_v_the_published_formula_is_left_alone(extinction: float, pressure_hpa: float) -> None:
    shares = ScatteringShares.at(550.0, extinction, pressure_hpa)
    assert (shares.gas, shares.haze) == pytest.approx((1.0, 1.0))


@pytest.mark.parametrize("wavelength_nm", [365.0, 438.0, 641.0, 798.0])
def test_gas_and_haze_each_scatter_as_they_extinguish(wavelength_nm: float) -> None:
    """Of a sky made of gas and a known haze, V and a band: each grows by its own law."""
    haze_v, growth = 0.05, (550.0 / wavelength_nm) ** 1.3
    gas, gas_v = float(rayleigh_mag(wavelength_nm, 880.0)), float(rayleigh_mag(550.0, 880.0))
    extinction, extinction_v = gas + haze_v * growth, gas_v + haze_v
    shares = ScatteringShares.at(wavelength_nm, extinction, 880.0)
    assert shares.gas * extinction / extinction_v == pytest.approx(gas / gas_v)
    assert shares.haze * extinction / extinction_v == pytest.approx(growth)


def test_moonlight_is_bluer_than_the_moon() -> None:
    """Sky of a full Moon against a dark one: most is added in B, least in I."""
    lit, dark = (
        sky_mags_arcsec2(FILTERS, altitude_deg=60.0, sun_altitude_deg=NIGHT_SUN_DEG, moon=moon)
        for moon in (MoonLight(50.0, 60.0, 0.0), NO_MOON)
    )
    added_b, added_v, added_i = dark - lit
    assert added_b > added_v > added_i > 0.3
    # As an object the added light in B and V is bluer than the Moon, whose B-V is 0.92.
    light = 10.0 ** (-0.4 * lit) - 10.0 ** (-0.4 * dark)
    assert -2.5 * np.log10(light[0] / light[1]) < 0.92 - 0.3


def test_gas_extinguishes_as_the_fourth_power_and_with_pressure() -> None:
    assert float(rayleigh_mag(400.0) / rayleigh_mag(800.0)) == pytest.approx(16.0, rel=0.08)
    assert float(rayleigh_mag(550.0, 506.625)) == pytest.approx(float(rayleigh_mag(550.0)) / 2.0)


@pytest.mark.parametrize("wavelength_nm", [340.0, 365.0, 438.0, 550.0, 656.3, 798.0, 1000.0])
def test_twilight_falls_without_a_seam_to_nothing(wavelength_nm: float) -> None:
    sun = np.arange(0.0, -18.5, -0.01)
    light = twilight_nanolambert(sun, wavelength_nm)
    until = sun > -17.995
    assert np.all(np.diff(light[until]) < 0.0)
    # No step of a hundredth of a degree is larger than 2 mag per degree, until it fades out.
    bright = sun > -16.0
    assert np.max(-2.5 * np.diff(np.log10(light[bright]))) < 0.02
    assert np.all(light[sun <= -18.0] == pytest.approx(0.0, abs=1e-9))
    assert twilight_nanolambert(30.0, wavelength_nm) == light[0]


def test_twilight_is_gone_at_eighteen_degrees() -> None:
    night = v_sky(90.0, -18.0, altitude_deg=-30.0)
    assert night == pytest.approx(21.6, abs=1e-6)
    assert 21.6 - v_sky(90.0, -16.0, altitude_deg=-30.0) == pytest.approx(0.1, abs=0.1)
    assert v_sky(90.0, 0.0, altitude_deg=-30.0) < 5.0
