"""Signal, noise and depth against worked examples and published formulas."""

from __future__ import annotations

import math

import numpy as np
import pytest

from engine.light import Aperture, Conditions, Reference, credit
from engine.light.scintillation import C_Y, scintillation_rms, scintillation_rms_young
from tests.engine.light_cases import a_filter, an_exposure_model
from tests.published.rows import Row, agrees, rows, told

# A telescope so large that nothing flickers, pixels of an arcsecond, and no rounding to counts:
# what the worked examples leave out.
PLAIN = {
    "aperture_m": 1e9,
    "pixel_arcsec": 1.0,
    "gain_e_per_adu": 1e-9,
    "zero_point_mag": 20.0,
    "extinction_mag": 0.0,
}


def magnitude_of(rate_e_per_s: float) -> float:
    """Return the magnitude that gives a rate with the plain zero point of 20."""
    return 20.0 - 2.5 * math.log10(rate_e_per_s)


def an_aperture(pixels: float) -> Aperture:
    """Return a circle of so many pixels of an arcsecond that holds all the light."""
    return Aperture(math.sqrt(pixels / math.pi), 1.0)


@pytest.mark.parametrize("row", rows("ccd.howell"))
def test_worked_signal_to_noise(row: Row) -> None:
    """The example is from memory."""
    inputs = row["inputs"]
    gain, time_s = inputs["gain"], inputs["t_s"]
    model = an_exposure_model(
        **PLAIN,
        read_noise_e=inputs["rdnoise_e"],
        dark_e_per_s=inputs["dark_e_pix_hr"] / 3600.0,
    )
    seen = Conditions(
        airmass=1.0,
        sky_mag_arcsec2=magnitude_of(inputs["nsky_adu"] * gain / time_s),
        aperture=an_aperture(inputs["npix"]),
    )
    star = magnitude_of(inputs["nstar_adu"] * gain / time_s)
    value = float(model.signal_to_noise(star, time_s, seen))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("ccd.mlim."))
def test_limiting_magnitude(row: Row) -> None:
    inputs = row["inputs"]
    model = an_exposure_model(
        **{**PLAIN, "zero_point_mag": 20.0 + 2.5 * math.log10(inputs["rate_e_s_at_m20"])},
        read_noise_e=inputs["rdnoise_e"],
        dark_e_per_s=inputs["dark_e_s"],
    )
    sky_mag = model.zero_point_mag - 2.5 * math.log10(inputs["sky_e_s_pix"])
    seen = Conditions(1.0, sky_mag, an_aperture(inputs["npix"]))
    value = float(model.limiting_magnitude(inputs["snr"], inputs["t_s"], seen))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("scint.young."))
def test_scintillation_by_the_classical_formula(row: Row) -> None:
    inputs = row["inputs"]
    value = float(scintillation_rms_young(inputs["D_m"], inputs["X"], inputs["t_s"], inputs["h_m"]))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("scint.osborn1.", "scint.osborn15."))
def test_scintillation(row: Row) -> None:
    """The published formula is the variance; the row, and our function, its root."""
    inputs = row["inputs"]
    value = float(
        scintillation_rms(
            inputs["D_m"], inputs["X"], inputs["t_s"], inputs["h_m"], c_y=inputs["C_Y"]
        )
    )
    assert agrees(row, value), told(row, value)
    variance = (
        10e-6
        * inputs["C_Y"] ** 2
        * inputs["D_m"] ** (-4 / 3)
        / inputs["t_s"]
        * inputs["X"] ** 3
        * math.exp(-2 * inputs["h_m"] / 8000)
    )
    assert not agrees(row, variance), "the variance was taken for the rms"


@pytest.mark.parametrize("row", rows("scint.osborn15."))
def test_scintillation_by_default(row: Row) -> None:
    inputs = row["inputs"]
    assert inputs["C_Y"] == C_Y
    value = float(scintillation_rms(inputs["D_m"], inputs["X"], inputs["t_s"], inputs["h_m"]))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("seeing.tscale."))
def test_exposure_time_against_image_size(row: Row) -> None:
    """As credit, and as the time a faint star needs over a bright sky."""
    ratio = row["inputs"]["fwhm_ratio"]
    reference = Reference(image_size_arcsec=1.4, sky_mag_arcsec2=21.6, airmass=1.2)
    value = 1.0 / float(credit(1.4 * ratio, 21.6, 1.2, a_filter(), reference))
    assert agrees(row, value), told(row, value)

    model = an_exposure_model(read_noise_e=0.0, gain_e_per_adu=1e-9, aperture_m=1e9)
    sizes = np.array([1.4, 1.4 * ratio])
    seen = Conditions(1.2, 17.0, Aperture(0.7 * sizes, 0.74))
    sharp_s, soft_s = model.seconds_for(5.0, 22.0, seen)
    assert soft_s / sharp_s == pytest.approx(row["expected"], rel=0.01)
