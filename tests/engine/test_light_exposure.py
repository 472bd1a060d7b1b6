"""Signal and noise: against drawn electrons, and forwards against backwards."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.image import ImageModel
from engine.light import Aperture, Conditions, ExposureModel
from engine.light.exposure import BEST_RADIUS_FWHM
from engine.light.scintillation import scintillation_rms
from tests.engine.image_cases import an_observatory
from tests.engine.light_cases import an_exposure_model

SEEN = Conditions(airmass=1.3, sky_mag_arcsec2=21.0, aperture=Aperture(1.2, 0.75))

magnitudes = st.floats(8.0, 23.0)
lengths = st.floats(0.1, 3600.0)
skies = st.floats(14.0, 22.5)
airmasses = st.floats(1.0, 5.0)


def gaussian_enclosed(fwhm_arcsec: float, radius_arcsec: float) -> float:
    """Return the share of a Gaussian image within a radius."""
    return float(1.0 - 2.0 ** (-4.0 * (radius_arcsec / fwhm_arcsec) ** 2))


@pytest.mark.parametrize(
    ("magnitude", "sky_pixels", "gain"),
    [(17.0, 400.0, 1.5), (12.0, 400.0, 1.5), (18.0, 40.0, 1.5), (18.0, 400.0, 30.0)],
    ids=["faint", "bright: scintillation", "sky from few pixels", "coarse counts"],
)
def test_noise_of_drawn_exposures(magnitude: float, sky_pixels: float, gain: float) -> None:
    """4000 exposures drawn pixel by pixel: Poisson light, read noise, flicker, whole counts.

    The star lights its pixels alike, which changes no sum. 4000 tell a scatter to 1.1 %.
    """
    model = an_exposure_model(gain_e_per_adu=gain)
    time_s, trials = 30.0, 4000
    pixels = round(math.pi * (1.2 / model.pixel_arcsec) ** 2)
    radius_arcsec = model.pixel_arcsec * math.sqrt(pixels / math.pi)
    seen = Conditions(1.3, 20.0, Aperture(radius_arcsec, 1.0), sky_pixels=sky_pixels)

    chance = np.random.default_rng(17)
    flicker = 1.0 + chance.normal(
        0.0, float(scintillation_rms(model.aperture_m, 1.3, time_s, model.elevation_m)), trials
    )
    star = float(model.star_e_per_s(magnitude, 1.3)) * time_s * flicker
    beside = (float(model.sky_e_per_s_per_pixel(20.0)) + model.dark_e_per_s) * time_s

    def counted(electrons: np.ndarray) -> np.ndarray:
        read = chance.poisson(electrons) + chance.normal(0.0, model.read_noise_e, electrons.shape)
        return np.asarray(gain * np.rint(read / gain))

    on_star = counted(np.repeat(star[:, None] / pixels + beside, pixels, axis=1)).sum(axis=1)
    sky = counted(np.full((trials, int(sky_pixels)), beside)).mean(axis=1)
    measured = on_star - pixels * sky
    expected = float(model.signal_to_noise(magnitude, time_s, seen))
    assert measured.mean() / measured.std() == pytest.approx(expected, rel=0.04)


@settings(deadline=None)
@given(magnitudes, lengths, skies, airmasses)
def test_time_and_depth_undo_signal_to_noise(
    magnitude: float, seconds: float, sky: float, airmass: float
) -> None:
    model = an_exposure_model()
    seen = Conditions(airmass, sky, Aperture(1.2, 0.75), sky_pixels=300.0)
    reached = float(model.signal_to_noise(magnitude, seconds, seen))
    assert float(model.seconds_for(reached, magnitude, seen)) == pytest.approx(seconds, rel=1e-6)
    # Close to the limit that scintillation sets every bright star looks the same.
    flicker = float(scintillation_rms(0.8, airmass, seconds, 1165.0))
    if reached * flicker < 0.99:
        depth = float(model.limiting_magnitude(reached, seconds, seen))
        assert depth == pytest.approx(magnitude, abs=1e-6)


def test_scintillation_limits_every_star_however_bright() -> None:
    model = an_exposure_model()
    flicker = float(scintillation_rms(0.8, 1.3, 10.0, 1165.0))
    assert float(model.signal_to_noise(0.0, 10.0, SEEN)) == pytest.approx(1.0 / flicker, rel=1e-3)
    assert math.isnan(float(model.limiting_magnitude(1.01 / flicker, 10.0, SEEN)))
    assert math.isfinite(float(model.limiting_magnitude(0.99 / flicker, 10.0, SEEN)))


def test_no_time_is_no_exposure() -> None:
    model = an_exposure_model()
    times = np.array([-1.0, 0.0, math.nan, 10.0])
    assert np.array_equal(np.isnan(model.signal_to_noise(18.0, times, SEEN)), [1, 1, 1, 0])
    assert np.array_equal(np.isnan(model.limiting_magnitude(5.0, times, SEEN)), [1, 1, 1, 0])


def test_everything_broadcasts() -> None:
    model = an_exposure_model()
    sizes = np.array([1.0, 1.5, 2.0])
    seen = Conditions(np.array([[1.0], [2.0]]), 21.0, Aperture(0.7 * sizes, 0.74))
    assert model.signal_to_noise(18.0, 60.0, seen).shape == (2, 3)
    assert model.seconds_for(10.0, 18.0, seen).shape == (2, 3)
    depths = model.limiting_magnitude(5.0, np.array([60.0, 120.0, 600.0])[:, None, None], seen)
    assert depths.shape == (3, 2, 3)
    assert np.all(np.diff(depths, axis=0) > 0.0)
    assert np.all(np.diff(depths, axis=1) < 0.0)
    assert np.all(np.diff(depths, axis=2) < 0.0)
    nothing = Conditions(math.nan, 21.0, Aperture(1.0, 0.7))
    assert np.isnan(model.signal_to_noise(18.0, 60.0, nothing))


def test_several_exposures_add_as_the_root() -> None:
    model = an_exposure_model()
    one, nine = (float(model.signal_to_noise(19.0, 60.0, SEEN, exposures=n)) for n in (1, 9))
    assert nine == pytest.approx(3.0 * one)
    # The read noise of nine is not that of one exposure nine times as long.
    assert nine < float(model.signal_to_noise(19.0, 540.0, SEEN))


def test_zero_point_airmass_and_pixel() -> None:
    model = an_exposure_model()
    assert float(model.star_e_per_s(23.1, 0.0)) == pytest.approx(1.0)
    dimmed = float(model.star_e_per_s(15.0, 2.0) / model.star_e_per_s(15.0, 1.0))
    assert dimmed == pytest.approx(10.0 ** (-0.4 * 0.16))
    assert float(model.sky_e_per_s_per_pixel(23.1)) == pytest.approx(0.33**2)


def test_best_radius_of_a_gaussian_image() -> None:
    """Faint star: S/N goes as share over radius, best at 0.67 FWHM; 0.7 loses next to nothing."""
    radii = np.linspace(0.3, 1.5, 1201)
    gains = np.array([gaussian_enclosed(1.0, radius) / radius for radius in radii])
    assert radii[gains.argmax()] == pytest.approx(0.673, abs=0.002)
    chosen = gaussian_enclosed(1.0, BEST_RADIUS_FWHM) / BEST_RADIUS_FWHM
    assert chosen > 0.995 * gains.max()


def test_aperture_of_a_predicted_image() -> None:
    """Through the image model's own numbers: near the best radius for its image as well."""
    images = ImageModel(an_observatory())
    size = float(images.size_arcsec(1, 1.5, 1.2))
    aperture = Aperture.best(size, lambda radius: images.enclosed(1, 1.5, 1.2, radius))
    assert float(np.asarray(aperture.radius_arcsec)) == pytest.approx(0.7 * size)
    model = ExposureModel.of(an_observatory(), 1)

    def reached(factor: float) -> float:
        radius = factor * size
        around = Aperture(radius, images.enclosed(1, 1.5, 1.2, radius))
        return float(model.signal_to_noise(20.0, 60.0, Conditions(1.2, 21.0, around)))

    best = max(reached(factor) for factor in np.linspace(0.4, 1.2, 33))
    assert float(model.signal_to_noise(20.0, 60.0, Conditions(1.2, 21.0, aperture))) > 0.98 * best


@settings(deadline=None)
@given(magnitudes, skies, st.floats(0.005, 0.6))
def test_saturation_fills_the_brightest_pixel(magnitude: float, sky: float, peak: float) -> None:
    model = an_exposure_model()
    seconds = float(model.saturation_s(magnitude, 1.2, sky, peak))
    rate = (
        float(model.star_e_per_s(magnitude, 1.2)) * peak
        + float(model.sky_e_per_s_per_pixel(sky))
        + model.dark_e_per_s
    )
    assert rate * seconds / model.gain_e_per_adu == pytest.approx(60000.0)


@settings(deadline=None)
@given(st.floats(1.0, 20_000.0), skies, st.floats(0.01, 0.3))
def test_parts_cost_no_more_read_noise_than_allowed(
    total_s: float, sky: float, share: float
) -> None:
    model = an_exposure_model()
    parts = model.best_subexposures(total_s, sky, read_noise_share=share)
    assert parts.count * parts.seconds == pytest.approx(total_s)
    assert not parts.saturated
    shortest_s = float(model.sky_limited_s(sky, read_noise_share=share))
    if parts.count > 1:
        assert parts.read_noise_share <= share * (1.0 + 1e-9)
        assert total_s / (parts.count + 1) < shortest_s
    elif total_s < shortest_s:
        assert parts.read_noise_share > share


def test_saturation_wins_over_read_noise() -> None:
    model = an_exposure_model()
    free = model.best_subexposures(3600.0, 21.5)
    bound = model.best_subexposures(3600.0, 21.5, longest_s=20.0)
    assert free.seconds > 20.0 >= bound.seconds
    assert bound.saturated
    assert bound.read_noise_share > 0.05 >= free.read_noise_share
    assert not model.is_sky_limited(20.0, 21.5)
    assert model.is_sky_limited(free.seconds, 21.5)


def test_read_noise_share_is_a_share_of_the_noise() -> None:
    """A faint star in parts against the same time at once."""
    model = an_exposure_model(dark_e_per_s=0.0)
    parts = model.best_subexposures(3600.0, 21.5)
    quiet = an_exposure_model(dark_e_per_s=0.0, read_noise_e=0.0, gain_e_per_adu=1e-9)
    sky = Conditions(1.3, 21.5, SEEN.aperture)
    in_parts = model.signal_to_noise(24.0, parts.seconds, sky, exposures=parts.count)
    at_once = quiet.signal_to_noise(24.0, 3600.0, sky)
    assert float(at_once / in_parts) == pytest.approx(1.0 + parts.read_noise_share, abs=0.005)
