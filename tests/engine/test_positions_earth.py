"""The Earth's rotation: our reading of the bundled table against astropy's, and time scales."""

from __future__ import annotations

from importlib.resources import files

import numpy as np
import pytest
from astropy.time import Time
from astropy.utils import iers

from engine.positions import earth, prepare_astropy, sidereal_time_h
from engine.positions.earth import (
    LARGEST_UT1_MINUS_UTC_S,
    UNKNOWN_UT1_S_PER_DAY,
    EarthTable,
    earth_table,
    pole_rad,
    table_of_finals,
    tt_mjd,
    ut1_minus_utc_s,
)

FIRST_MJD_OF_2000 = 51544.0
ARCSEC_PER_RADIAN = 206264.806
# Bulletin B, read here, and the C04 series, which astropy puts in its place, differ by this much.
SERIES_APART_S = 0.0006
SERIES_APART_ARCSEC = 0.001


def test_table_is_astropys() -> None:
    prepare_astropy()
    theirs = iers.IERS_Auto.open()
    known = np.isfinite(theirs["UT1_UTC"].value)
    ours = earth_table()
    assert np.array_equal(ours.mjd, theirs["MJD"].value[known])
    recent = ours.mjd >= FIRST_MJD_OF_2000
    apart_s = np.abs(ours.ut1_minus_utc_s - theirs["UT1_UTC"].value[known])
    assert float(apart_s[recent].max()) < SERIES_APART_S
    assert float(apart_s.max()) < 0.006
    for column, pole in (("PM_x", ours.pole_x_rad), ("PM_y", ours.pole_y_rad)):
        apart_arcsec = np.abs(pole * ARCSEC_PER_RADIAN - theirs[column].value[known])
        assert float(apart_arcsec[recent].max()) < SERIES_APART_ARCSEC


def test_predicted_days_are_bulletin_a_to_the_last_digit() -> None:
    theirs = iers.IERS_Auto.open()
    known = np.isfinite(theirs["UT1_UTC"].value)
    ahead = ~np.isfinite(theirs["UT1_UTC_B"].value[known])
    ours = earth_table()
    assert int(ahead.sum()) > 300
    assert np.array_equal(ours.ut1_minus_utc_s[ahead], theirs["UT1_UTC_A"].value[known][ahead])


def test_interpolation_is_astropys_across_a_leap_second() -> None:
    """At 2016-12-31 UT1 - UTC steps by a second; on either side and far from it we agree."""
    mjd = np.array([57752.4, 57753.0, 57754.0, 57754.6, 60000.5, 61222.25])
    theirs_s = Time(mjd, format="mjd", scale="utc").delta_ut1_utc
    assert ut1_minus_utc_s(mjd) == pytest.approx(theirs_s, abs=SERIES_APART_S)
    during = ut1_minus_utc_s(np.linspace(57753.0, 57753.99, 50))
    assert float(np.ptp(during)) < 0.002, "the step of the leap second leaked into the day before"


def test_values_are_held_beyond_both_ends() -> None:
    table = earth_table()
    outside = np.array([30000.0, table.last_mjd + 1000.0])
    assert ut1_minus_utc_s(outside) == pytest.approx(table.ut1_minus_utc_s[[0, -1]], abs=1e-12)
    assert pole_rad(outside)[0] == pytest.approx(table.pole_x_rad[[0, -1]], abs=1e-15)


def test_what_an_old_table_costs_is_what_held_values_would_have_cost() -> None:
    """The table itself since 2000: hold each day's value for a month to two years, and look."""
    table = earth_table()
    recent = table.mjd >= FIRST_MJD_OF_2000
    steady_s = (table.ut1_minus_utc_s - earth._steps_s())[recent]
    worst = [
        float(np.abs(steady_s[days:] - steady_s[:-days]).max()) / days
        for days in range(30, 731, 10)
    ]
    assert max(worst) <= UNKNOWN_UT1_S_PER_DAY
    assert max(worst) == pytest.approx(UNKNOWN_UT1_S_PER_DAY, rel=0.05), "more than it can cost"


def test_leap_seconds_have_kept_their_bound() -> None:
    assert float(np.abs(earth_table().ut1_minus_utc_s).max()) <= LARGEST_UT1_MINUS_UTC_S


def test_a_strange_file_is_refused() -> None:
    with pytest.raises(ValueError, match="UT1"):
        table_of_finals(["not", "a table"])
    text = (files("astropy_iers_data") / "data" / "finals2000A.all").read_text(encoding="ascii")
    with pytest.raises(ValueError, match="days"):
        table_of_finals([line[1:] for line in text.splitlines()[:20]])


def test_astropys_reader_is_the_way_out(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(lines: list[str]) -> EarthTable:
        raise ValueError("strange")

    monkeypatch.setattr(earth, "table_of_finals", refuse)
    found = earth_table.__wrapped__()  # past the cache
    assert np.array_equal(found.mjd, earth_table().mjd)
    assert found.last_mjd == earth_table().last_mjd


def test_terrestrial_time_is_astropys() -> None:
    # Days that end in a leap second are left out: there astropy's day has 86401 s, ours never.
    mjd = np.array([41500.0, 44239.25, 48988.5, 53736.0, 57753.0, 57754.0, 61222.9])
    assert tt_mjd(mjd) == pytest.approx(Time(mjd, format="mjd", scale="utc").tt.mjd, abs=1e-10)


def test_times_far_ahead_keep_the_last_leap_second() -> None:
    assert float(tt_mjd(80000.0) - 80000.0) * 86400.0 == pytest.approx(37.0 + 32.184, abs=1e-5)


def test_sidereal_time_is_astropys() -> None:
    mjd = 60300.0 + np.linspace(0.0, 1300.0, 27)
    theirs = Time(mjd, format="mjd", scale="utc").sidereal_time("apparent", longitude="-70.6d")
    apart_h = np.mod(sidereal_time_h(mjd, -70.6) - theirs.hour + 12.0, 24.0) - 12.0
    # 10 ms of time: polar motion is in astropy's and not in ours.
    assert float(np.abs(apart_h).max()) * 3600.0 < 0.06
