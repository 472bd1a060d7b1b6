"""Airmass against published formulas, values in other people's tests, and a ray through the air."""

from __future__ import annotations

import math

import numpy as np
import pytest

from engine.positions import AIRMASS_MODELS, airmass, effective_airmass
from tests.published.rows import Row, agrees, rows, told

NOT_USED = {
    "airmass.young_irvine_1967.": "this model isn't shipped: it diverges past 80 deg",
    "airmass.rozenberg_1966.": "this model isn't shipped: two others cover its range",
    "airmass.allen_shell_750.": "this model isn't shipped: a shell of one height is only a sketch",
    "airmass.pvlibtest.young_irvine_1967.": "this model isn't shipped: it diverges past 80 deg",
}

MODEL_OF_ROW = {
    "sec z": "secant",
    "Hardie 1962": "hardie",
    "Kasten & Young 1989": "kasten_young",
    "Young 1994 (TRUE zenith angle)": "young",
    "Pickering 2002 (apparent alt.)": "pickering",
}


def zenith_deg(row: Row) -> float:
    """Return a row's zenith angle in degrees."""
    inputs = row["inputs"]
    return float(inputs["z_deg"] if "z_deg" in inputs else math.degrees(inputs["z_rad"]))


@pytest.mark.parametrize(
    "row",
    rows(
        "airmass.planeparallel.",
        "airmass.hardie",
        "airmass.kasten_young_1989.",
        "airmass.young_1994.",
        "airmass.pickering_2002.",
        "airmass.pvlibtest.kasten_young_1989.",
        "airmass.pvlibtest.young_1994.",
        "airmass.pvlibtest.pickering_2002.",
    ),
)
def test_formula_of_its_own_angle(row: Row) -> None:
    model = AIRMASS_MODELS[MODEL_OF_ROW[row["model"]]]
    value = float(model.of_altitude(np.array(90.0 - zenith_deg(row))))
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("airmass.raytrace_isa."))
@pytest.mark.parametrize("model", ["pickering", "kasten_young", "young"])
def test_near_a_ray_through_the_standard_atmosphere(row: Row, model: str) -> None:
    """An independent integral, of the apparent zenith angle.

    The row's tolerance is the integral's own. The formulas stay with it to 0.3 % down to 85 deg of
    zenith angle and to some percent at the horizon.
    """
    value = float(airmass(90.0 - zenith_deg(row), model=model))
    allowed = 0.003 if zenith_deg(row) <= 85.0 else 0.03
    assert value == pytest.approx(row["expected"], rel=allowed + row["tol_rel"]), told(row, value)


@pytest.mark.parametrize("row", rows("airmass.effective."))
def test_mean_of_an_exposure(row: Row) -> None:
    inputs = row["inputs"]
    value = float(effective_airmass(inputs["x_begin"], inputs["x_mid"], inputs["x_end"]))
    assert agrees(row, value), told(row, value)
