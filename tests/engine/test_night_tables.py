"""The night's tables: limits and their reasons, progress, and every target at one moment."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.image import ImageModel
from engine.logbook import Logbook, Target, load_logbook, sample_logbook
from engine.night import (
    REASONS,
    Night,
    Outlooks,
    bit_of,
    open_night,
    plans,
    reason_coded,
    reasons_in,
    targets_at,
)
from engine.night.outlook import normal_share
from engine.positions import skyline_altitude_deg
from engine.rehearsal import NIGHT


@pytest.fixture(scope="module")
def logbook() -> Logbook:
    """Return the sample logbook."""
    return load_logbook(sample_logbook())


@pytest.fixture(scope="module")
def night(logbook: Logbook) -> Night:
    """Return the tables of the rehearsal's night."""
    return open_night(logbook, NIGHT)


def with_bit(night: Night, code: str) -> np.ndarray:
    """Return where (N, T) a limit is broken."""
    return np.asarray((night.limits & np.uint32(bit_of(code))) != 0)


def test_reasons_are_one_bit_each_and_told_in_order() -> None:
    """Codes and bits are unique, and several at once come back most important first."""
    assert len({reason.code for reason in REASONS}) == len(REASONS)
    assert len({reason.bit for reason in REASONS}) == len(REASONS)
    assert all(reason.bit & (reason.bit - 1) == 0 for reason in REASONS)
    both = bit_of("too_low") | bit_of("moon_near") | bit_of("finished")
    assert [each.code for each in reasons_in(both)] == ["finished", "too_low", "moon_near"]
    with pytest.raises(KeyError):
        reason_coded("no such reason")


def test_each_limit_is_where_its_own_definition_says(night: Night) -> None:
    """The bits agree with the tables they are made from, over the whole night."""
    seen, telescope = night.apparent_altitude_deg, night.observatory.telescope
    assert np.array_equal(with_bit(night, "below_horizon"), seen <= 0.0)
    assert np.array_equal(with_bit(night, "too_low"), seen < telescope.minimum_altitude_deg)
    assert np.array_equal(with_bit(night, "too_high"), seen > telescope.maximum_altitude_deg)
    skyline = skyline_altitude_deg(night.observatory.site.horizon, night.where.azimuth_deg)
    assert np.array_equal(with_bit(night, "skyline"), seen < skyline)
    least, greatest = telescope.hour_angle_limits_h
    outside = (night.where.hour_angle_h < least) | (night.where.hour_angle_h > greatest)
    assert np.array_equal(with_bit(night, "hour_angle"), outside)


def test_a_targets_own_limits_are_its_own(night: Night) -> None:
    """Airmass, Moon and windows bind the targets that have them, and no others."""
    index = night.target_index("M 67")
    assert night.targets[index].maximum_airmass == 1.8
    high = night.airmass[index] > 1.8
    assert high.any()
    assert np.array_equal(with_bit(night, "airmass")[index], high)
    for place, target in enumerate(night.targets):
        if target.maximum_airmass is None:
            assert not with_bit(night, "airmass")[place].any()
        if target.minimum_moon_separation_deg is None:
            assert not with_bit(night, "moon_near")[place].any()
    windowed = night.target_index("HW Vir")
    inside = ~with_bit(night, "window")[windowed]
    (begin, end), _ = night.targets[windowed].windows_mjd
    assert inside.sum() == pytest.approx((end - begin) * 1440.0, abs=1.5)
    assert night.mjd[inside].min() >= begin
    assert night.mjd[inside].max() <= end


def at_place(name: str, ra_deg: float, dec_deg: float, **limits: float) -> Target:
    """Return a target somewhere, with limits of its own."""
    plan = [{"filter": "V", "seconds": 60.0, "count": 1}]
    place = {"ra": ra_deg % 360.0, "dec": dec_deg}
    return Target.model_validate({"name": name, "exposures": plan, **place, **limits})


def test_nothing_near_the_sun_may_be_observed_while_it_is_up(logbook: Logbook) -> None:
    """Up is until sunset and from sunrise on; near is what the logbook's caution says."""
    assert logbook.observatory.caution.sun_separation_deg == 30.0
    evening = open_night(logbook, NIGHT).sun
    sun_ra_deg, sun_dec_deg = float(evening.ra_deg[0]), float(evening.dec_deg[0])
    near = at_place("near", sun_ra_deg + 25.0, sun_dec_deg)
    far = at_place("far", sun_ra_deg + 36.0, sun_dec_deg)
    night = open_night(replace(logbook, targets=(near, far)), NIGHT)
    assert night.almanac.sunset is not None
    assert night.almanac.sunrise is not None
    up = (night.mjd < night.almanac.sunset) | (night.mjd > night.almanac.sunrise)
    assert np.array_equal(with_bit(night, "sun_near")[0], up)
    assert not with_bit(night, "sun_near")[1].any()


def test_a_target_keeps_its_distance_from_a_moon_that_is_up(logbook: Logbook) -> None:
    """In a night, the Moon walks 7 degrees; below the horizon it harms nobody."""
    moon = open_night(logbook, NIGHT).moon
    middle = len(moon.ra_deg) // 2
    place = (float(moon.ra_deg[middle]), float(moon.dec_deg[middle]))
    wants = at_place("wants", *place, minimum_moon_separation_deg=30.0)
    night = open_night(replace(logbook, targets=(wants, at_place("minds not", *place))), NIGHT)
    assert night.almanac.moonrise is not None
    moon_is_up = night.moon.altitude_deg > 0.0
    assert moon_is_up.any()
    assert not moon_is_up.all()
    assert np.array_equal(with_bit(night, "moon_near")[0], moon_is_up)
    assert not with_bit(night, "moon_near")[1].any()


def test_daylight_ends_with_the_last_filter_that_is_dark(night: Night) -> None:
    """A narrow band with a limit of its own opens a target before its broad ones are dark."""
    narrow = night.target_index("NGC 1566")
    broad = night.target_index("M 67")
    sun = night.sun.altitude_deg
    assert np.array_equal(with_bit(night, "daylight")[narrow], sun > -10.0)
    assert np.array_equal(with_bit(night, "daylight")[broad], sun > -12.0)


def test_the_grid_is_whole_minutes_from_before_sunset_to_after_sunrise(night: Night) -> None:
    """The tables cover the night with half an hour to spare at both ends."""
    steps = np.diff(night.mjd) * 1440.0
    assert np.allclose(steps, 1.0, atol=1e-6)
    assert night.almanac.sunset is not None
    assert night.almanac.sunrise is not None
    assert 29.0 <= (night.almanac.sunset - night.mjd[0]) * 1440.0 <= 32.0
    assert 29.0 <= (night.mjd[-1] - night.almanac.sunrise) * 1440.0 <= 32.0
    assert night.index_at(0.0) == 0
    assert night.index_at(1e9) == night.last


@dataclass(frozen=True)
class Took:
    """An exposure as far as progress needs it."""

    target: str
    filter: str
    seconds: float
    credit: float | None = 1.0


def test_progress_counts_by_filter_and_length(logbook: Logbook) -> None:
    """An exposure counts for the line of its filter and length, else of its filter."""
    target = next(each for each in logbook.targets if each.name == "M 67")
    name = target.name
    taken = [
        Took(name, "B", 90.0, 0.5),
        Took(name, "V", 60.0),
        Took(name, "V", 999.0),
        Took(name, "Ha", 300.0),
        Took("nobody's", "B", 90.0),
    ]
    lines = {line.filter: line for line in plans([target], taken)[name]}
    assert (lines["B"].done, lines["B"].credit, lines["B"].remaining) == (1, 0.5, 7)
    assert lines["V"].done == 2
    assert lines["I"].done == 0


@given(st.lists(st.sampled_from(["B", "V", "I"]), max_size=40))
def test_progress_never_counts_below_zero(filters: list[str]) -> None:
    """However many are taken, what remains is never negative and all are counted."""
    target = next(t for t in load_logbook(sample_logbook()).targets if t.name == "M 67")
    lines = plans([target], [Took("M 67", name, 60.0) for name in filters])["M 67"]
    assert sum(line.done for line in lines) == len(filters)
    assert all(line.remaining == max(line.planned - line.done, 0) for line in lines)


def test_a_worse_seeing_softens_what_has_a_limit(logbook: Logbook, night: Night) -> None:
    """Every size grows with the seeing, and only targets with a limit become too soft."""
    outlooks = Outlooks(night, ImageModel(logbook.observatory, night.air))
    good = outlooks.given(np.full(len(night.mjd), 1.0))
    bad = outlooks.given(np.full(len(night.mjd), 3.5))
    known = np.isfinite(good.image_size_arcsec)
    assert (bad.image_size_arcsec[known] > good.image_size_arcsec[known]).all()
    assert (bad.quality <= good.quality).all()
    mjd = float(night.mjd[len(night.mjd) // 3])
    progress = plans(night.targets, [])
    for now in targets_at(night, bad, mjd, progress):
        limited = now.target.maximum_image_size_arcsec is not None
        soft = any(reason.code == "too_soft" for reason in now.reasons)
        assert soft <= limited
    soft_now = [
        now.target.name
        for now in targets_at(night, bad, mjd, progress)
        if any(reason.code == "too_soft" for reason in now.reasons)
    ]
    assert "NGC 2243" in soft_now


def test_the_chance_of_sharp_images_is_that_of_many_nights(logbook: Logbook, night: Night) -> None:
    """As often as is said, images are within the limit when the seeing is drawn from its band."""
    outlooks = Outlooks(night, ImageModel(logbook.observatory, night.air))
    random = np.random.default_rng(5)
    median, sigma_ln = 2.0, 0.2
    shape = len(night.mjd)
    told = outlooks.given(np.full(shape, median), np.full(shape, median * math.exp(sigma_ln)))
    drawn = [
        ~outlooks.given(np.full(shape, median * math.exp(sigma_ln * float(kick)))).soft
        for kick in random.standard_normal(400)
    ]
    up = np.isfinite(night.airmass) & (night.airmass < 3.0)
    limited = [t.maximum_image_size_arcsec is not None for t in night.targets]
    judged = (up & np.array(limited)[:, None])[None] & np.ones((told.chance.shape[0], 1, 1), bool)
    error = told.chance[judged] - np.mean(drawn, axis=0)[judged]
    # 400 draws scatter by 0.025.
    assert np.abs(error).max() < 0.1
    assert abs(error.mean()) < 0.02
    assert (told.chance[judged] > 0.05).any()
    assert ((told.chance[judged] > 0.5) == ~told.soft[judged]).all()
    free = (up & ~np.array(limited)[:, None])[None] & np.ones_like(judged)
    assert (told.chance[free] == 1.0).all()


def test_the_normal_distribution_is_the_library_s() -> None:
    """The short series against the standard library's error function."""
    sigmas = np.linspace(-5.0, 5.0, 401)
    known = [0.5 * (1.0 + math.erf(each / math.sqrt(2.0))) for each in sigmas]
    assert np.abs(normal_share(sigmas.astype(np.float32)) - known).max() < 1e-6


def test_a_finished_plan_is_a_reason(night: Night, logbook: Logbook) -> None:
    """A target whose plan is done says so first."""
    target: Target = night.targets[night.target_index("SA 98")]
    taken = [
        Took(target.name, e.filter, e.seconds) for e in target.exposures for _ in range(e.count)
    ]
    outlook = Outlooks(night, ImageModel(logbook.observatory, night.air)).given(
        np.full(len(night.mjd), 1.5)
    )
    seen = targets_at(night, outlook, float(night.mjd[200]), plans(night.targets, taken))
    now = next(each for each in seen if each.target.name == target.name)
    assert now.reasons[0].code == "finished"
    assert not now.observable
