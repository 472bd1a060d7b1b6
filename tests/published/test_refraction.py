"""Refraction against published formulas, tables and worked examples."""

from __future__ import annotations

import math

import pytest

from engine.positions import Air, refraction_deg, true_altitude_deg
from engine.positions.refraction import (
    bennett_arcmin,
    bennett_improved_arcmin,
    saemundsson_arcmin,
)
from tests.published.rows import Row, agrees, rows, told

NOT_USED = {
    "refraction.erfa.refco.": "ERFA's own test of a function that we do not call",
    "refraction.almanac_low.": "this formula isn't shipped: Saemundsson covers all altitudes",
    "refraction.almanac_high.": "this formula isn't shipped: Saemundsson covers all altitudes",
}

FITTED_AIR = Air(pressure_hpa=1010.0, temperature_c=10.0)
# The Pulkovo tables are for 1013.25 hPa and 15 deg C.
PULKOVO_AIR = Air(pressure_hpa=1013.25, temperature_c=15.0)
# What refraction_deg promises: a share of refraction, and the least it can be off (arcsec).
PROMISED_SHARE = 0.035
PROMISED_ARCSEC = 3.0


@pytest.mark.parametrize("row", rows("refraction.bennett.", "refraction.meeus16a.bennett"))
def test_bennett(row: Row) -> None:
    value = float(bennett_arcmin(row["inputs"]["h_apparent_deg"]))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("refraction.bennett_improved."))
def test_bennett_improved(row: Row) -> None:
    value = float(bennett_improved_arcmin(row["inputs"]["h_apparent_deg"]))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("refraction.saemundsson.", "refraction.meeus16a.saemundsson"))
def test_saemundsson(row: Row) -> None:
    altitude_deg = row["inputs"]["h_true_deg"]
    for value in (
        float(saemundsson_arcmin(altitude_deg)),
        60.0 * float(refraction_deg(altitude_deg, FITTED_AIR)),
    ):
        assert agrees(row, value), told(row, value)


def refraction_at_apparent_arcsec(apparent_deg: float, air: Air) -> float:
    """Return what our refraction is at an apparent altitude."""
    return 3600.0 * (apparent_deg - float(true_altitude_deg(apparent_deg, air)))


@pytest.mark.parametrize("row", rows("refraction.pulkovo"))
def test_near_the_pulkovo_tables(row: Row) -> None:
    """The row's tolerance is that of the table, and ours a formula of two constants."""
    value = refraction_at_apparent_arcsec(row["inputs"]["h_apparent_deg"], PULKOVO_AIR)
    allowed = max(PROMISED_ARCSEC, PROMISED_SHARE * row["expected"])
    assert value == pytest.approx(row["expected"], abs=allowed), told(row, value)


@pytest.mark.parametrize("row", rows("refraction.sla_refro"))
def test_near_a_ray_at_a_mountain(row: Row) -> None:
    """As above: the row's tolerance is meant for models of two fitted constants and better."""
    inputs = row["inputs"]
    air = Air(inputs["P_hPa"], inputs["T_K"] - 273.15, 100.0 * inputs["RH"])
    apparent_deg = 90.0 - math.degrees(inputs["zd_obs_rad"])
    value = math.radians(refraction_at_apparent_arcsec(apparent_deg, air) / 3600.0)
    assert value == pytest.approx(row["expected"], rel=PROMISED_SHARE), told(row, value)
