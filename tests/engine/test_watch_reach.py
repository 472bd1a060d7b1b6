"""What an exposure reaches: the answers hold when they are put in as questions."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

from engine.errors import NoAnswer
from engine.image import ImageModel
from engine.logbook import Observatory, load_logbook, sample_logbook
from engine.watch import Reach, Scene, reach

SCENE = Scene(filter_index=1, seeing_arcsec=1.6, airmass=1.3, sky_mag_arcsec2=21.0)
STAR_MAG = 13.0


@pytest.fixture(scope="module")
def observatory() -> Observatory:
    """Return the sample's observatory."""
    return load_logbook(sample_logbook()).observatory


@pytest.fixture(scope="module")
def model(observatory: Observatory) -> ImageModel:
    """Return its image model."""
    return ImageModel(observatory)


def reached(
    observatory: Observatory, model: ImageModel, seconds: float, magnitude: float | None = STAR_MAG
) -> Reach:
    """Return what an exposure reaches in the scene above."""
    return reach(observatory, model, SCENE, seconds, magnitude)


def test_a_star_at_the_limit_is_seen_at_five(observatory: Observatory, model: ImageModel) -> None:
    limit_mag = reached(observatory, model, 60.0).limiting_magnitude
    assert reached(observatory, model, 60.0, limit_mag).signal_to_noise == pytest.approx(5.0)


def test_the_time_for_a_hundred_gives_a_hundred(
    observatory: Observatory, model: ImageModel
) -> None:
    seconds = reached(observatory, model, 60.0).seconds_for_100
    assert reached(observatory, model, seconds).signal_to_noise == pytest.approx(100.0)


def test_a_star_saturates_past_its_time_and_its_parts_stay_short_of_it(
    observatory: Observatory, model: ImageModel
) -> None:
    longest_s = reached(observatory, model, 60.0).saturation_s
    assert not reached(observatory, model, 0.99 * longest_s).saturates
    too_long = reached(observatory, model, 2.5 * longest_s)
    assert too_long.saturates
    assert too_long.parts.count >= 3
    assert too_long.parts.seconds <= longest_s


def test_without_a_magnitude_only_what_needs_none_is_told(
    observatory: Observatory, model: ImageModel
) -> None:
    told = reached(observatory, model, 60.0, None)
    assert math.isnan(told.signal_to_noise)
    assert math.isnan(told.saturation_s)
    assert not told.saturates
    assert told.limiting_magnitude == reached(observatory, model, 60.0).limiting_magnitude


def test_below_the_horizon_nothing_is_reached(observatory: Observatory, model: ImageModel) -> None:
    below = replace(SCENE, airmass=math.nan)
    with pytest.raises(NoAnswer, match="below the horizon"):
        reach(observatory, model, below, 60.0, STAR_MAG)
