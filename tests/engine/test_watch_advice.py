"""Cautions: what was typed last against the observatory's thresholds."""

from __future__ import annotations

import pytest

from engine.log import Conditions, fold
from engine.logbook import Caution
from engine.watch import cautions

CAUTION = Caution(humidity_percent=85.0, wind_m_per_s=12.0, dew_margin_c=2.5)


def codes(*entered: Conditions) -> list[str]:
    """Return the codes of the cautions that entries call for, one after the other."""
    events = (each.stamped(n, 61479.0 + n / 1440.0) for n, each in enumerate(entered, start=1))
    return [each.code for each in cautions(fold(events), CAUTION)]


@pytest.mark.parametrize(
    ("entered", "expected"),
    [
        (Conditions(humidity_percent=85.0), []),
        (Conditions(humidity_percent=86.0), ["humidity"]),
        (Conditions(wind_m_per_s=12.0), []),
        (Conditions(wind_m_per_s=12.5), ["wind"]),
        (Conditions(temperature_c=10.0, dew_point_c=7.5), []),
        (Conditions(temperature_c=-1.0, dew_point_c=-3.0), ["dew"]),
        (Conditions(temperature_c=1.0), []),
        (Conditions(dew_point_c=20.0), []),
        (
            Conditions(
                humidity_percent=99.0, wind_m_per_s=30.0, temperature_c=5.0, dew_point_c=5.0
            ),
            ["humidity", "wind", "dew"],
        ),
    ],
)
def test_a_caution_is_for_what_is_beyond_its_threshold(
    entered: Conditions, expected: list[str]
) -> None:
    assert codes(entered) == expected


def test_the_last_value_typed_is_the_one_that_counts() -> None:
    """Each quantity by itself: temperature and dew point may come an hour apart."""
    assert codes(Conditions(wind_m_per_s=20.0), Conditions(wind_m_per_s=3.0)) == []
    assert codes(Conditions(dew_point_c=9.0), Conditions(temperature_c=10.0)) == ["dew"]


def test_a_caution_says_who_decides() -> None:
    state = fold([Conditions(wind_m_per_s=14.0).stamped(1, 61479.0)])
    (said,) = cautions(state, CAUTION)
    assert said.sentence == (
        "wind 14 m/s, caution above 12 m/s; the observatory's own rules decide"
    )
