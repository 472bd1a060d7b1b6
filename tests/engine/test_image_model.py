"""The image model's doors: tables, lookups, updates, inversion, and what they refuse."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from engine.errors import NoAnswer
from engine.image import ImageModel
from engine.image.contour import size_arcsec
from engine.image.dispersion import dispersion_arcsec, filter_dispersion_arcsec, refractivity
from engine.positions import Air
from engine.positions import airmass as airmass_of
from tests.engine.image_cases import Case, an_observatory, galsim_profile, random_case

MODEL = ImageModel(an_observatory())
COARSE = ImageModel(an_observatory(pixel_arcsec=3.0, aperture_m=2.0))
CASES = [random_case(np.random.default_rng(seed)) for seed in range(12)]

seeings = st.floats(0.3, 6.0)
airmasses = st.floats(1.0, 4.0)


@settings(max_examples=200, deadline=None)
@given(st.sampled_from(CASES), seeings, airmasses)
def test_table_agrees_with_direct_convolution(
    case: Case, seeing_arcsec: float, airmass: float
) -> None:
    direct = size_arcsec(case.model.blur(0, seeing_arcsec, airmass))
    assert float(case.model.size_arcsec(0, seeing_arcsec, airmass)) == pytest.approx(
        direct, rel=2e-3
    )


@settings(max_examples=300, deadline=None)
@given(st.floats(-90.0, 90.0), st.floats(0.0, 50.0))
def test_every_altitude_and_seeing_has_a_size_or_none(
    altitude_deg: float, seeing_arcsec: float
) -> None:
    airmass = float(airmass_of(np.array(altitude_deg)))
    sizes = MODEL.sizes_arcsec(seeing_arcsec, airmass)
    exists = altitude_deg >= 0.0 and seeing_arcsec > 0.0
    assert sizes.shape == (4,)
    assert np.all(np.isfinite(sizes)) == exists
    assert np.all(np.isnan(sizes)) == (not exists)
    if exists:
        assert np.all(sizes > 0.5)
        assert 0.0 < MODEL.peak_fraction(0, seeing_arcsec, airmass) <= 1.0
        assert 0.0 < MODEL.enclosed(0, seeing_arcsec, airmass, 1.0) <= 1.0
        assert MODEL.breakdown(0, seeing_arcsec, airmass).size_arcsec > 0.5
    else:
        assert math.isnan(MODEL.peak_fraction(0, seeing_arcsec, airmass))
        with pytest.raises(NoAnswer):
            MODEL.breakdown(0, seeing_arcsec, airmass)


@settings(max_examples=200, deadline=None)
@given(st.sampled_from(CASES), seeings, airmasses)
def test_inversion_undoes_prediction(case: Case, seeing_arcsec: float, airmass: float) -> None:
    size = float(case.model.size_arcsec(0, seeing_arcsec, airmass))
    # An image the seeing hardly changes can't tell it: ask for one that it does.
    assume(case.model.size_arcsec(0, 1.05 * seeing_arcsec, airmass) > 1.005 * size)
    assume(size > 1.2 * case.model.observatory.pixel_arcsec)
    found = case.model.zenith_seeing_arcsec(0, size, airmass)
    assert found == pytest.approx(seeing_arcsec, rel=1e-6)


def test_inversion_beyond_the_table() -> None:
    size = float(MODEL.size_arcsec(1, 45.0, 1.3))
    assert MODEL.zenith_seeing_arcsec(1, size, 1.3) == pytest.approx(45.0, rel=1e-9)


def test_an_image_too_sharp_for_the_instrument() -> None:
    with pytest.raises(NoAnswer, match="sharper than this telescope gives"):
        MODEL.zenith_seeing_arcsec(0, 0.4, 1.2)


def test_an_image_of_one_pixel_tells_no_seeing() -> None:
    """Two seeings would explain it: see `test_a_blurred_square_loses_its_corners`."""
    model = ImageModel(
        an_observatory(
            pixel_arcsec=3.0, aperture_m=4.0, optics_fwhm_arcsec=0.0, tracking_fwhm_arcsec=0.0
        )
    )
    with pytest.raises(NoAnswer, match="hardly more than one pixel"):
        model.zenith_seeing_arcsec(1, 3.3, 1.0)


@pytest.mark.parametrize("nonsense", [math.nan, -1.0, 0.0, math.inf])
def test_inversion_of_nonsense(nonsense: float) -> None:
    with pytest.raises(NoAnswer):
        MODEL.zenith_seeing_arcsec(0, nonsense, 1.2)
    with pytest.raises(NoAnswer):
        MODEL.zenith_seeing_arcsec(0, 1.5, nonsense)


@settings(max_examples=100, deadline=None)
@given(seeings, airmasses, st.floats(1.001, 1.5))
def test_sizes_grow_with_seeing_and_with_airmass(
    seeing_arcsec: float, airmass: float, factor: float
) -> None:
    here = MODEL.sizes_arcsec(seeing_arcsec, airmass)
    assert np.all(MODEL.sizes_arcsec(seeing_arcsec * factor, airmass) > here)
    assert np.all(MODEL.sizes_arcsec(seeing_arcsec, airmass * factor) > here)


def test_shapes_broadcast_and_filters_can_be_chosen() -> None:
    airmass = np.array([[1.0, 1.5, np.nan], [2.0, 3.0, 40.0]])
    seeing = np.array([0.8, 1.0, 1.2])
    sizes = MODEL.sizes_arcsec(seeing, airmass)
    assert sizes.shape == (4, 2, 3)
    assert np.isnan(sizes[:, 0, 2]).all()
    assert np.isfinite(np.delete(sizes.reshape(4, -1), 2, axis=1)).all()
    np.testing.assert_array_equal(MODEL.sizes_arcsec(seeing, airmass, [2]), sizes[2:3])
    np.testing.assert_array_equal(MODEL.size_arcsec(2, seeing, airmass), sizes[2])
    assert float(MODEL.size_arcsec(2, 1.0, 1.5)) == sizes[2, 0, 1]
    assert MODEL.sizes_arcsec(seeing[:, None], 1.2).shape == (4, 3, 1)


def test_prepared_sizes_are_those_of_the_table() -> None:
    rng = np.random.default_rng(3)
    airmass = rng.uniform(1.0, 6.0, (30, 50))
    airmass[4, 7] = np.nan
    seeing = rng.uniform(0.05, 30.0, 50)
    seeing[9] = np.nan
    prepared = MODEL.prepare(airmass)
    for each in (seeing, 1.3):
        wanted = MODEL.sizes_arcsec(each, airmass)
        np.testing.assert_allclose(prepared.sizes_arcsec(each), wanted, rtol=1e-5)
    assert np.isnan(prepared.sizes_arcsec(seeing)[:, 4, 7]).all()
    assert np.isnan(prepared.sizes_arcsec(seeing)[:, :, 9]).all()


def test_prepared_takes_one_seeing_or_one_for_each_minute() -> None:
    with pytest.raises(ValueError, match="expected one value or 50"):
        MODEL.prepare(np.ones((3, 50))).sizes_arcsec(np.ones(3))


def test_peak_fraction_against_galsim() -> None:
    for seeing_arcsec, airmass in ((0.8, 1.0), (1.5, 2.5)):
        drawn = galsim_profile(MODEL.blur(0, seeing_arcsec, airmass)).drawImage(
            nx=3, ny=3, scale=0.02, method="sb", dtype=float
        )
        share = drawn.array[1, 1] * MODEL.observatory.pixel_arcsec**2
        assert MODEL.peak_fraction(0, seeing_arcsec, airmass) == pytest.approx(share, rel=5e-3)


def test_peak_fraction_stays_a_share() -> None:
    assert COARSE.peak_fraction(0, 0.3, 1.0) > 0.9
    shares = COARSE.peak_fractions(0, np.array([0.1, 0.5, 2.0, 20.0, 60.0]), 1.0)
    assert np.all((shares > 0.0) & (shares <= 1.0))
    assert np.all(np.diff(shares) < 0.0)
    assert shares[4] == pytest.approx(shares[3] / 9.0, rel=1e-6)


def test_a_dispersion_corrector_makes_images_rounder() -> None:
    corrected = ImageModel(an_observatory(), dispersion_corrected=True)
    plain, better = MODEL.breakdown(0, 1.0, 3.0), corrected.breakdown(0, 1.0, 3.0)
    assert better.elongation == pytest.approx(1.0, abs=2e-3)
    assert plain.elongation > 1.15
    assert better.size_arcsec == pytest.approx(plain.without.dispersion, rel=1e-4)
    assert better.terms.dispersion == 0.0


def test_the_air_of_the_night_changes_dispersion() -> None:
    dense = ImageModel(an_observatory(), Air(1013.25, -10.0, 20.0))
    assert dense.breakdown(0, 1.0, 3.0).size_arcsec > MODEL.breakdown(0, 1.0, 3.0).size_arcsec


def test_outer_scale_makes_images_smaller() -> None:
    with_scale = ImageModel(an_observatory(outer_scale_m=25.0))
    terms = with_scale.breakdown(1, 1.0, 1.0).terms
    # 17 % at r0 = 0.1 m: Tokovinin 2002, eq. 19.
    assert terms.atmosphere == pytest.approx(0.833 * 550**-0.2 * 500**0.2, rel=0.015)
    assert np.all(with_scale.sizes_arcsec(1.0, 1.3) < MODEL.sizes_arcsec(1.0, 1.3))


def test_blame_by_what_rules_the_image() -> None:
    assert MODEL.breakdown(1, 2.5, 1.0).blame == "atmosphere"
    assert COARSE.breakdown(1, 0.4, 1.0).blame == "sampling"
    small = ImageModel(an_observatory(aperture_m=0.05, pixel_arcsec=0.3))
    assert small.breakdown(1, 0.5, 1.0).blame == "diffraction"
    shaky = ImageModel(an_observatory(tracking_fwhm_arcsec=4.0))
    assert shaky.breakdown(1, 1.0, 1.0).blame == "tracking"
    blue = ImageModel(an_observatory(filters=(("U", 365.0, 66.0),), tracking_fwhm_arcsec=0.0))
    assert blue.breakdown(0, 0.4, 3.5).blame == "dispersion"


def test_undersampled_under_two_pixels() -> None:
    assert COARSE.breakdown(1, 1.0, 1.0).undersampled
    assert not MODEL.breakdown(1, 1.0, 1.0).undersampled


def test_standard_air_of_the_site_unless_told() -> None:
    assert MODEL.air == Air.standard(2000.0)


def test_wide_blue_filters_end_where_the_air_does() -> None:
    """Nothing bluer than 300 nm comes through: a box of ±400 nm must not reach eq. 1's pole."""
    blue = an_observatory(filters=(("W", 300.0, 800.0),)).filters[0]
    air = Air.standard(2000.0)
    length = float(filter_dispersion_arcsec(blue, 1.5, air))
    assert length == pytest.approx(float(dispersion_arcsec(300.0, 700.0, 1.5, air)))


@settings(max_examples=100, deadline=None)
@given(
    st.floats(300.0, 1100.0),
    st.floats(0.0, 1100.0),
    st.floats(-60.0, 60.0),
    st.floats(0.0, 200.0),
)
def test_no_air_is_refused(
    wavelength_nm: float, pressure_hpa: float, temperature_c: float, humidity_percent: float
) -> None:
    air = Air(pressure_hpa, temperature_c, humidity_percent)
    assert np.isfinite(refractivity(wavelength_nm, air))
    assert np.isnan(dispersion_arcsec(400.0, wavelength_nm, math.nan, air))
    assert dispersion_arcsec(400.0, wavelength_nm, 0.9997, air) == 0.0
    assert dispersion_arcsec(400.0, wavelength_nm, 2.0, air, corrected=True) == 0.0
