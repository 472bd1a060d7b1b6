"""Credit, twilight flats and zero points."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.image import ImageModel
from engine.light import (
    Aperture,
    Conditions,
    Reference,
    clear_share,
    credit,
    decline_from_sun_per_s,
    decline_measured_per_s,
    depth_share,
    evening_flat_s,
    implied_throughput,
    morning_flat_s,
    zero_point_doubt,
)
from engine.light.credit import CREDIT_CEILING, REFERENCE_AIRMASS
from engine.logbook import load_logbook, sample_logbook
from tests.engine.image_cases import an_observatory
from tests.engine.light_cases import a_filter, an_exposure_model

V = a_filter()
REFERENCE = Reference(image_size_arcsec=1.4, sky_mag_arcsec2=21.6, airmass=1.2)


def test_reference_conditions_are_worth_one() -> None:
    assert float(credit(1.4, 21.6, 1.2, V, REFERENCE)) == pytest.approx(1.0)
    observatory = an_observatory()
    model = ImageModel(observatory)
    found = Reference.of(observatory, model, 1)
    assert found.airmass == REFERENCE_AIRMASS
    assert found.sky_mag_arcsec2 == observatory.filters[1].dark_sky_mag
    size = float(model.size_arcsec(1, observatory.seeing.typical_arcsec, REFERENCE_AIRMASS))
    assert found.image_size_arcsec == pytest.approx(size)


@pytest.mark.parametrize(
    ("size", "sky", "airmass", "cloud", "expected"),
    [
        (2.4, 21.6, 1.2, 0.0, (1.4 / 2.4) ** 2),
        (1.4, 20.85, 1.2, 0.0, 10.0**-0.3),
        (1.4, 21.6, 2.2, 0.0, 10.0 ** (-0.8 * 0.16)),
        (1.4, 21.6, 1.2, 0.5, 10.0**-0.4),
        (0.7, 22.0, 1.0, 0.0, CREDIT_CEILING),
    ],
    ids=["soft", "bright sky", "low", "cloud", "ceiling"],
)
def test_worked_values(
    size: float, sky: float, airmass: float, cloud: float, expected: float
) -> None:
    value = float(credit(size, sky, airmass, V, REFERENCE, cloud_mag=cloud))
    assert value == pytest.approx(expected)


@settings(deadline=None)
@given(st.floats(0.9, 3.5), st.floats(18.5, 21.8), st.floats(1.0, 3.0))
def test_credit_is_the_inverse_of_the_time_a_faint_star_needs(
    size: float, sky: float, airmass: float
) -> None:
    """Against the exposure model itself, without read noise, dark current and scintillation."""
    model = an_exposure_model(
        read_noise_e=0.0, gain_e_per_adu=1e-9, dark_e_per_s=0.0, aperture_m=1e9
    )

    def needed_s(size: float, sky: float, airmass: float) -> float:
        seen = Conditions(airmass, sky, Aperture(0.7 * size, 0.74))
        return float(model.seconds_for(5.0, 25.0, seen))

    ratio = needed_s(1.4, 21.6, 1.2) / needed_s(size, sky, airmass)
    value = float(credit(size, sky, airmass, V, REFERENCE))
    assert value == pytest.approx(min(ratio, CREDIT_CEILING), rel=0.03)


def test_arrays_nan_and_the_two_halves() -> None:
    sizes = np.array([[1.2, 1.6, math.nan]])
    airmass = np.array([[1.1], [math.nan], [2.0]])
    value = credit(sizes, 21.0, airmass, V, REFERENCE)
    assert value.shape == (3, 3)
    assert np.array_equal(np.isnan(value), np.isnan(sizes) | np.isnan(airmass))
    clear = clear_share(21.0, airmass, V, REFERENCE)
    assert np.array_equal(depth_share(sizes, clear, REFERENCE), value, equal_nan=True)


@settings(deadline=None)
@given(st.floats(100.0, 1e5), st.floats(10.0, 1e4), st.floats(1e-4, 2e-2))
def test_flats_collect_what_was_wanted(wanted: float, start: float, decline: float) -> None:
    """The light of the exposure, summed up step by step."""

    def collected(seconds: float, power: float) -> float:
        steps = (np.arange(20_000) + 0.5) / 20_000 * seconds
        return float(np.mean(start * np.exp(power * steps)) * seconds)

    morning = float(morning_flat_s(wanted, start, decline))
    assert collected(morning, decline) == pytest.approx(wanted, rel=1e-5)
    evening = float(evening_flat_s(wanted, start, decline))
    assert math.isnan(evening) == (wanted * decline >= start)
    if not math.isnan(evening):
        assert evening > morning
        assert collected(evening, -decline) == pytest.approx(wanted, rel=1e-3)


def test_flats_broadcast_and_the_impossible_is_silent() -> None:
    starts = np.array([50.0, 79.0, 80.0, 1000.0])
    times = evening_flat_s(20_000.0, starts, 0.004)
    assert np.array_equal(np.isnan(times), [True, True, True, False])
    assert morning_flat_s(20_000.0, starts, 0.004).shape == (4,)


def test_decline_from_the_sun_and_from_two_levels() -> None:
    per_s = float(decline_from_sun_per_s(-0.25))
    assert per_s == float(decline_from_sun_per_s(0.25))
    after = 900.0 * math.exp(-60.0 * per_s)
    assert float(decline_measured_per_s(900.0, after, 60.0)) == pytest.approx(per_s)
    assert float(decline_measured_per_s(after, 900.0, 60.0)) == pytest.approx(per_s)


def test_the_sample_logbooks_zero_points_are_plausible() -> None:
    observatory = load_logbook(sample_logbook()).observatory
    for each in observatory.filters:
        assert zero_point_doubt(each, observatory.telescope) is None, each.name


@pytest.mark.parametrize(("zero_point_mag", "share"), [(18.0, "0.43 %"), (26.0, "6.8e+02 %")])
def test_a_mistyped_zero_point_is_doubted(zero_point_mag: float, share: str) -> None:
    telescope = an_observatory(aperture_m=0.8).telescope
    doubt = zero_point_doubt(a_filter(zero_point_mag=zero_point_mag), telescope)
    assert doubt is not None
    assert share in doubt
    assert doubt.startswith(f"zero_point_mag {zero_point_mag:g} in V")


def test_throughput_goes_with_area_and_width() -> None:
    telescope = an_observatory(aperture_m=0.8).telescope
    once = implied_throughput(V, telescope)
    assert implied_throughput(a_filter(width_nm=170.0), telescope) == pytest.approx(once / 2.0)
    larger = an_observatory(aperture_m=1.6).telescope
    assert implied_throughput(V, larger) == pytest.approx(once / 4.0)
