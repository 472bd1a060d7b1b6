"""The record of an exposure, against the night's tables, which are made another way."""

from __future__ import annotations

import pytest

from engine.image import ImageModel
from engine.light import Reference
from engine.log import Exposure, ExposureStart
from engine.logbook import load_logbook, sample_logbook
from engine.night import Night
from engine.rehearsal import NIGHT
from engine.times import SECONDS_PER_DAY
from engine.watch.planning import Planner
from engine.watch.record import Ending, credit_measured, exposure_record

SEEING_ARCSEC = 1.3
# Two minutes, so that its middle is a minute of the tables.
SECONDS = 120.0
FILTER = "V"


@pytest.fixture(scope="module")
def planner() -> Planner:
    """Return the planner of the rehearsal's night on the sample logbook."""
    return Planner(load_logbook(sample_logbook()), NIGHT)


def taken(
    planner: Planner, target: str, at: int, exposed_s: float = SECONDS, filter_: str = FILTER
) -> Exposure:
    """Return the record of an exposure that began at a minute of the tables."""
    start_mjd = float(planner.night.mjd[at])
    began = ExposureStart(
        n=7, run=6, t_mjd=start_mjd, target=target, programme="P", filter=filter_, seconds=SECONDS,
        start_mjd=start_mjd,
    )  # fmt: skip
    ending = Ending(start_mjd + exposed_s / SECONDS_PER_DAY, "good")
    return exposure_record(planner.night, planner.model, began, ending, SEEING_ARCSEC)


def high_minute(night: Night, index: int) -> int:
    """Return the minute at which a target is highest in the dark."""
    dark = night.sun.altitude_deg < -18.0
    return int((night.where.altitude_deg[index] * dark).argmax())


def test_where_it_looked_is_what_the_tables_have_for_its_middle(planner: Planner) -> None:
    night, model = planner.night, planner.model
    index = night.target_index("NGC 3532")
    at = high_minute(night, index) - 90
    record, middle = taken(planner, "NGC 3532", at), at + 1
    place = night.observatory.filter_index(FILTER)
    assert record.mid_mjd == pytest.approx(night.mjd[middle], abs=1e-9)
    for key, expected in (
        ("altitude_deg", night.where.altitude_deg[index, middle]),
        ("azimuth_deg", night.where.azimuth_deg[index, middle]),
        ("hour_angle_h", night.where.hour_angle_h[index, middle]),
        ("airmass_start", night.airmass[index, at]),
        ("airmass_mid", night.airmass[index, middle]),
        ("airmass_end", night.airmass[index, at + 2]),
        ("moon_separation_deg", night.moon_separation_deg[index, middle]),
        ("moon_altitude_deg", night.moon.altitude_deg[middle]),
        ("moon_illumination", night.moon.illumination[middle]),
    ):
        assert getattr(record, key) == pytest.approx(float(expected), abs=2e-4), key
    assert record.sky_mag_arcsec2 == pytest.approx(
        float(night.sky_mag_arcsec2[place, index, middle]), abs=2e-3
    )
    size = float(model.size_arcsec(place, SEEING_ARCSEC, night.airmass[index, middle]))
    assert record.image_size_arcsec == pytest.approx(size, rel=0.005)
    assert record.seeing_arcsec == SEEING_ARCSEC


def test_half_an_exposure_is_worth_half(planner: Planner) -> None:
    at = high_minute(planner.night, planner.night.target_index("NGC 3532"))
    whole, half = (taken(planner, "NGC 3532", at, seconds) for seconds in (SECONDS, SECONDS / 2))
    assert half.exposed_s == SECONDS / 2
    assert whole.credit is not None
    assert half.credit == pytest.approx(0.5 * whole.credit, rel=0.01)


def test_below_the_horizon_there_is_nothing_to_tell(planner: Planner) -> None:
    """The observer may have exposed all the same: what happened is kept, the rest left out."""
    night = planner.night
    index = int(night.where.altitude_deg[:, 0].argmin())
    record = taken(planner, night.targets[index].name, 0)
    assert record.exposed_s == SECONDS
    assert record.altitude_deg is not None
    assert record.altitude_deg < 0.0
    assert (record.airmass_mid, record.image_size_arcsec, record.credit) == (None, None, None)


def test_what_has_left_the_logbook_is_recorded_as_it_happened(planner: Planner) -> None:
    for record in (taken(planner, "gone", 100), taken(planner, "M 67", 100, filter_="gone")):
        assert record.of == 7
        assert (record.run, record.exposed_s, record.outcome) == (6, SECONDS, "good")
        assert (record.altitude_deg, record.credit) == (None, None)


def test_a_measured_image_of_twice_the_reference_is_worth_a_quarter(planner: Planner) -> None:
    """On the reference's own sky and airmass, where nothing else counts."""
    observatory = planner.logbook.observatory
    place = observatory.filter_index(FILTER)
    model = ImageModel(observatory, planner.night.air)
    reference = Reference.of(observatory, model, place)
    exposure = Exposure(
        of=1, target="M 67", filter=FILTER, seconds=SECONDS, exposed_s=SECONDS, start_mjd=0.0,
        mid_mjd=0.0, end_mjd=0.0, outcome="good", airmass_mid=reference.airmass,
        sky_mag_arcsec2=reference.sky_mag_arcsec2,
    )  # fmt: skip
    worth = credit_measured(planner, exposure, 2.0 * reference.image_size_arcsec)
    assert worth == pytest.approx(0.25, abs=1e-3)
