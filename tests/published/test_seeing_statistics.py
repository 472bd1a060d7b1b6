"""What the seeing forecast takes from published statistics of seeing."""

from __future__ import annotations

import math
import re
from statistics import NormalDist

import pytest

from engine.seeing import SeeingMeasurement, summary
from engine.seeing.bank import E_FOLDING_MIN, LEVEL_SPREAD_LN, SPREAD_LN
from tests.published.rows import Row, agrees, all_rows, rows, told

NOT_USED = {
    "seeing.stat.orm.summer_median": "a season's median: a logbook has one usual value",
    "seeing.stat.spm.": "one site's own values: a logbook states its own",
    "seeing.orm.recovery": "half of a jump is let die away in the forgetting time, none in hours",
}


@pytest.mark.parametrize("row", rows("seeing.racine.tau"))
def test_forgetting_time(row: Row) -> None:
    assert agrees(row, E_FOLDING_MIN), told(row, E_FOLDING_MIN)


@pytest.mark.parametrize("row", rows("seeing.racine.ratio"))
def test_spread(row: Row) -> None:
    """Our spread gives the published mean ratio of two values far apart in time."""
    mean_ratio = 2.0 * math.exp(SPREAD_LN**2) * NormalDist().cdf(SPREAD_LN * math.sqrt(2.0))
    assert agrees(row, mean_ratio), told(row, mean_ratio)


@pytest.mark.parametrize("row", rows("seeing.orm.lognormal_sigma"))
def test_spread_between_nights(row: Row) -> None:
    """Our two spreads together are the whole published one, to the rounding of ours."""
    value = math.hypot(LEVEL_SPREAD_LN, SPREAD_LN)
    assert value == pytest.approx(row["expected"], abs=0.005), told(row, value)


@pytest.mark.parametrize("row", rows("seeing.stat.orm.mean", "seeing.stat.orm.median"))
def test_mean_and_median_of_a_site(row: Row) -> None:
    """The two go with each other at our spread, by the lognormal relation."""
    median = next(r["expected"] for r in all_rows() if r["id"] == "seeing.stat.orm.median")
    half_variance = 0.5 * (LEVEL_SPREAD_LN**2 + SPREAD_LN**2)
    value = median * math.exp(half_variance) if row["id"].endswith("mean") else median
    assert agrees(row, value), told(row, value)


@pytest.mark.parametrize("row", rows("seeing.lognormal."))
def test_summary_of_lognormal_values(row: Row) -> None:
    """Mean over median, and the quartiles of the note, from values spread evenly in chance."""
    sigma, count = row["inputs"]["sigma"], 20_000
    chances = [(place + 0.5) / count for place in range(count)]
    values = [math.exp(sigma * NormalDist().inv_cdf(chance)) for chance in chances]
    found = summary([SeeingMeasurement(0.0, value) for value in values])
    assert found is not None
    mean_over_median = sum(values) / count / found.median_arcsec
    assert agrees(row, mean_over_median), told(row, mean_over_median)
    _, quarter, three_quarters, _ = map(float, re.findall(r"\d\.\d+", row["note"]))
    assert found.lower_quartile_arcsec == pytest.approx(quarter, abs=2e-4)
    assert found.upper_quartile_arcsec == pytest.approx(three_quarters, abs=2e-4)
