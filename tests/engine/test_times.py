"""Nights and moments: named by their evening, whatever the computer's own zone thinks."""

from __future__ import annotations

import os
import subprocess
import sys
from datetime import UTC, date, datetime

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.times import (
    datetime_from_mjd,
    iso_from_mjd,
    mjd_from_datetime,
    mjd_from_iso,
    night_of,
    night_span_mjd,
)

SYDNEY = "Australia/Sydney"


def test_a_night_keeps_its_name_over_midnight() -> None:
    """From local noon to local noon it is one night, named by the date of its evening."""
    # Sydney is 11 h ahead of UTC in March.
    for moment in ("2027-03-14T01:00:01Z", "2027-03-14T13:00:01Z", "2027-03-15T00:59:59Z"):
        assert night_of(mjd_from_iso(moment), SYDNEY) == date(2027, 3, 14)
    assert night_of(mjd_from_iso("2027-03-15T01:00:01Z"), SYDNEY) == date(2027, 3, 15)


@pytest.mark.parametrize(
    ("night", "hours"),
    [(date(2027, 3, 14), 24.0), (date(2027, 4, 3), 25.0), (date(2027, 10, 2), 23.0)],
)
def test_the_clocks_may_change_in_a_night(night: date, hours: float) -> None:
    """Summer time ends on 4 April 2027 and begins on 3 October: 25 and 23 hours, one name."""
    begin_mjd, end_mjd = night_span_mjd(night, SYDNEY)
    assert (end_mjd - begin_mjd) * 24.0 == pytest.approx(hours, abs=1e-6)
    for share in (0.001, 0.3, 0.5, 0.7, 0.999):
        assert night_of(begin_mjd + share * (end_mjd - begin_mjd), SYDNEY) == night


def test_the_computers_own_zone_does_not_matter() -> None:
    """A computer set to another part of the world names the same night and stamps the same UTC."""
    code = (
        "from engine.times import *; m = mjd_from_iso('2027-03-14T13:30:00Z');"
        f"print(night_of(m, {SYDNEY!r}), iso_from_mjd(m), mjd_from_iso('2027-03-14T13:30:00') == m)"
    )
    told = {
        subprocess.run(
            [sys.executable, "-c", code],
            env={**os.environ, "TZ": zone},
            capture_output=True,
            text=True,
            check=True,
        ).stdout
        for zone in ("UTC", "America/Lima", "Pacific/Kiritimati")
    }
    assert told == {"2027-03-14 2027-03-14T13:30:00.000Z True\n"}


@given(st.datetimes(datetime(1900, 1, 1), datetime(2100, 1, 1)))
def test_moments_come_back_to_the_millisecond(naive: datetime) -> None:
    """MJD and ISO are each other's inverse."""
    moment = naive.replace(tzinfo=UTC, microsecond=naive.microsecond // 1000 * 1000)
    mjd = mjd_from_datetime(moment)
    assert datetime_from_mjd(mjd) == moment
    assert mjd_from_iso(iso_from_mjd(mjd)) == pytest.approx(mjd, abs=1e-9)


def test_a_moment_without_a_zone_is_refused_inside() -> None:
    """Only at the edge may a missing zone be taken for UTC."""
    with pytest.raises(ValueError, match="no time zone"):
        mjd_from_datetime(datetime(2027, 3, 14))
