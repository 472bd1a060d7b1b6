"""Differential refraction against Filippenko 1982 and line lists."""

from __future__ import annotations

from typing import Any

import pytest

from engine.image.dispersion import (
    HPA_PER_MMHG,
    air_wavelength_nm,
    dispersion_arcsec,
    refractivity,
    standard_refractivity,
    vapour_pressure_hpa,
)
from engine.positions.air import Air
from tests.published.rows import Row, agrees, rows, told


def air_of(inputs: dict[str, Any]) -> Air:
    """Return the air of a row, which gives vapour as a pressure: his own is 106 % humidity."""
    saturated_hpa = vapour_pressure_hpa(Air(1000.0, inputs["T_C"], 100.0))
    return Air(
        pressure_hpa=inputs["P_mmHg"] * HPA_PER_MMHG,
        temperature_c=inputs["T_C"],
        humidity_percent=100.0 * inputs["f_mmHg"] * HPA_PER_MMHG / saturated_hpa,
    )


@pytest.mark.parametrize("row", rows("adr.filippenko.X", "adr.sealevel."))
def test_refraction_relative_to_500_nm(row: Row) -> None:
    inputs = row["inputs"]
    shift = dispersion_arcsec(
        inputs["lambda_A"] / 10.0, inputs["ref_A"] / 10.0, inputs["sec_z"], air_of(inputs)
    )
    assert agrees(row, float(shift)), told(row, float(shift))


@pytest.mark.parametrize("row", rows("adr.filter."))
def test_dispersion_across_a_filter(row: Row) -> None:
    inputs = row["inputs"]
    length = dispersion_arcsec(
        inputs["lambda1_A"] / 10.0, inputs["lambda2_A"] / 10.0, inputs["sec_z"], air_of(inputs)
    )
    assert agrees(row, float(length)), told(row, float(length))


@pytest.mark.parametrize("row", rows("adr.filippenko.n_std"))
def test_standard_air(row: Row) -> None:
    """The row is eq. 2 at 760 mmHg and 15 deg C, which differs from eq. 1 by 5 parts in 10⁷."""
    wavelength_nm = row["inputs"]["lambda_A"] / 10.0
    value = 1e6 * float(refractivity(wavelength_nm, Air(1013.25, 15.0, 0.0)))
    assert agrees(row, value), told(row, value)
    assert 1e6 * float(standard_refractivity(wavelength_nm)) == pytest.approx(value, rel=1e-6)


@pytest.mark.parametrize("row", rows("adr.filippenko.n_site"))
def test_air_at_his_site(row: Row) -> None:
    value = 1e6 * float(refractivity(row["inputs"]["lambda_A"] / 10.0, air_of(row["inputs"])))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("phot.line."))
def test_wavelength_in_air(row: Row) -> None:
    value = 10.0 * float(air_wavelength_nm(row["inputs"]["vac_A"] / 10.0))
    assert agrees(row, value), told(row, value)
