"""The light of magnitude 0 against published photon fluxes."""

from __future__ import annotations

import pytest

from engine.light.photometry import AB_ZERO_JY, photons_per_s_m2_nm, vega_photons_per_s_m2_nm
from tests.published.rows import Row, agrees, rows, told

CM2_ANGSTROM_PER_M2_NM = 1e5


@pytest.mark.parametrize("row", rows("phot.vega."))
def test_photons_of_vega(row: Row) -> None:
    wavelength_nm = 1000.0 * row["inputs"]["lambda_um"]
    value = float(vega_photons_per_s_m2_nm(wavelength_nm)) / CM2_ANGSTROM_PER_M2_NM
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("phot.ab."))
def test_photons_of_ab_zero(row: Row) -> None:
    value = float(photons_per_s_m2_nm(AB_ZERO_JY, 1000.0 * row["inputs"]["lambda_um"]))
    value /= CM2_ANGSTROM_PER_M2_NM
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("phot.cfa."))
def test_photons_through_a_filter(row: Row) -> None:
    inputs = row["inputs"]
    flux_jy = inputs["f0_Jy"] * 10.0 ** (-0.4 * inputs["V"])
    wavelength_nm = 545.0  # only its ratio to the width matters
    width_nm = inputs["dlam_over_lam"] * wavelength_nm
    value = float(photons_per_s_m2_nm(flux_jy, wavelength_nm)) * width_nm
    assert agrees(row, value), told(row, value)
