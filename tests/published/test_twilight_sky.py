"""The twilight sky and flats against measured twilights."""

from __future__ import annotations

import math

import pytest

from engine.light import MoonLight, decline_from_sun_per_s, evening_flat_s, morning_flat_s
from engine.light.flats import decline_measured_per_s, halving_s
from engine.light.sky import sky_mag_arcsec2
from engine.light.twilight import FIT_DARK_MAG, FIT_NM, SLOPE_MAG_PER_DEG
from tests.engine.light_cases import a_filter
from tests.published.rows import Row, agrees, all_rows, rows, told

SUN_DEG_PER_MIN_AT_EQUATOR = 0.25
NO_MOON = MoonLight(-30.0, 90.0, 180.0)
BANDS = ("U", "B", "V", "R", "I")


def decline_of(dex_per_min: float) -> float:
    """Return a decline per second from one in powers of ten per minute."""
    return dex_per_min * math.log(10.0) / 60.0


def sun_speed(latitude_deg: float) -> float:
    """Return how fast the Sun sinks at an equinox, in degrees a minute."""
    return SUN_DEG_PER_MIN_AT_EQUATOR * math.cos(math.radians(latitude_deg))


def zenith_sky(row: Row) -> float:
    """Return our whole sky over the dark sky that the fit was measured with."""
    band = BANDS.index(row["inputs"]["band"])
    each = a_filter(wavelength_nm=FIT_NM[band], dark_sky_mag=FIT_DARK_MAG[band])
    sun_altitude_deg = 90.0 - row["inputs"]["sun_zenith_deg"]
    return float(
        sky_mag_arcsec2(each, altitude_deg=90.0, sun_altitude_deg=sun_altitude_deg, moon=NO_MOON)
    )


@pytest.mark.parametrize("row", rows(*(f"twilight.patat.{band}" for band in BANDS)))
def test_zenith_twilight(row: Row) -> None:
    """Well within the row's 0.2 mag, the scatter of the measurements: the fit itself comes back."""
    value = zenith_sky(row)
    assert agrees(row, value), told(row, value)
    assert value == pytest.approx(row["expected"], abs=0.02)


@pytest.mark.parametrize("row", rows("twilight.patat.gammaV"))
def test_mean_slope(row: Row) -> None:
    assert agrees(row, SLOPE_MAG_PER_DEG), told(row, SLOPE_MAG_PER_DEG)


@pytest.mark.parametrize("row", rows("twilight.ing.slope"))
def test_decline_at_la_palma(row: Row) -> None:
    """From the Sun's speed and one slope to another site's own measurement, latitude 28.76."""
    value = -60.0 / math.log(10.0) * float(decline_from_sun_per_s(sun_speed(28.76)))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("twilight.tysongal.k"))
def test_decline_at_thirty_degrees(row: Row) -> None:
    """The row is from memory."""
    value = -60.0 / math.log(10.0) * float(decline_from_sun_per_s(sun_speed(30.0)))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("twilight.ing.halving"))
def test_halving_time(row: Row) -> None:
    value = float(halving_s(decline_of(0.103))) / 60.0
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("twilight.ing.B."))
def test_decline_from_two_levels(row: Row) -> None:
    """The row's counts and those it had ten minutes before: its slope comes back.

    The counts themselves are another telescope's; the slope is the page's.
    """
    slope = -next(float(r["expected"]) for r in all_rows() if r["id"] == "twilight.ing.slope")
    before = row["expected"] * 10.0 ** (10.0 * slope)
    value = float(decline_measured_per_s(before, row["expected"], 600.0))
    assert value == pytest.approx(decline_of(slope), rel=1e-9)


@pytest.mark.parametrize("row", rows("twilight.exptime.even."))
def test_evening_flat(row: Row) -> None:
    inputs = row["inputs"]
    value = float(evening_flat_s(inputs["N_e"], inputs["S0_e_s"], decline_of(inputs["k"])))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("twilight.exptime.morn."))
def test_morning_flat(row: Row) -> None:
    inputs = row["inputs"]
    value = float(morning_flat_s(inputs["N_e"], inputs["S0_e_s"], decline_of(inputs["k"])))
    assert agrees(row, value), told(row, value)
