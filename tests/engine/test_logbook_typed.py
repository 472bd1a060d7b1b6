"""A target typed in one line."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.logbook import Target, typed_target

WHEEL = ("B", "V", "Ha")


@pytest.mark.parametrize(
    "text",
    [
        "05:34:31.94 +22:00:52.2 V:60x5",
        "05 34 31.94 +22 00 52.2 V:60x5",
        "5:34:31.94+22:0:52.2 V:60x5",
        "053431.94 +220052.2 V:60x5",
        "053431.94+220052.2   V:60x5  ",
        "83.63308 +22.01450 V:60x5",
    ],
)
def test_coordinates_in_every_form_are_the_same_place(text: str) -> None:
    target = typed_target(text, WHEEL)
    # 5h 34m 31.94s is 83.633083 degrees, 22d 0' 52.2" is 22.014500: by hand.
    assert target.ra_deg == pytest.approx(83.633083, abs=1e-5)
    assert target.dec_deg == pytest.approx(22.0145, abs=1e-5)
    assert (target.exposures[0].filter, target.exposures[0].count) == ("V", 5)
    assert target.priority == 5
    assert target.name == "T 0535+2201"


@pytest.mark.parametrize(
    ("place", "name"),
    [
        ("23:59:50 -00:30:00", "T 0000-0030"),
        ("12:07:00 +00:30:00", "T 1207+0030"),
        ("00:59:00 -89:59:40", "T 0059-9000"),
    ],
)
def test_without_a_name_its_coordinates_are_one(place: str, name: str) -> None:
    """To the minute, with the sign of a declination less than a degree."""
    assert typed_target(f"{place} V:60x5", WHEEL).name == name


def test_a_name_may_stand_anywhere_behind_the_coordinates() -> None:
    target = typed_target("05:34:31 -00:30:00 Ha:300x2 SN in NGC 1 B:30x1", WHEEL)
    assert target.name == "SN in NGC 1"
    assert target.dec_deg == -0.5
    assert [(e.filter, e.seconds, e.count) for e in target.exposures] == [
        ("Ha", 300.0, 2),
        ("B", 30.0, 1),
    ]


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("", "expected coordinates"),
        ("M 67 V:60x5", "expected coordinates"),
        ("05:34:31 22:00:52 V:60x5", "the second with its sign"),
        ("05:34:31 +22:00:52", "expected exposures such as V:60x5"),
        ("05:34:31 +22:00:52 W:60x5", "no filter is called 'W'"),
        ("25:34:31 +22:00:52 V:60x5", "ra"),
        ("05:34:31 +92:00:52 V:60x5", "dec"),
        ("05:34:31 +22:00:52 V:60x0", "count"),
    ],
)
def test_what_is_wrong_is_said_in_one_line(text: str, said: str) -> None:
    with pytest.raises(ValueError, match=re.escape(said)) as caught:
        typed_target(text, WHEEL)
    assert "\n" not in str(caught.value)


@given(
    st.text(max_size=60)
    | st.from_regex(r"[0-9:. ]{4,12}[+-][0-9:. ]{4,12} V:[0-9]{1,4}x[0-9]{1,3}.{0,20}")
)
def test_anything_typed_is_a_target_or_a_plain_sentence(text: str) -> None:
    said = _answer(text)
    if isinstance(said, str):
        assert said.isprintable()
    else:
        assert 0 <= said.ra_deg < 360
        assert -90 <= said.dec_deg <= 90
        assert said.name.isprintable()


def _answer(text: str) -> Target | str:
    try:
        return typed_target(text, WHEEL)
    except ValueError as error:
        return str(error)
