"""The finder: zeros of quantities whose zeros are known."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from numpy.typing import NDArray

from engine.positions import crossings, spans_above

Floats = NDArray[np.float64]

BEGIN_MJD, END_MJD = 61000.0, 61001.0
HALF_SECOND_DAYS = 0.5 / 86400.0

cycles = st.floats(0.1, 20.0)
phases = st.floats(0.0, 1.0, exclude_max=True)


def wave(cycles_per_day: float, phase: float, mjd: Floats) -> Floats:
    """Return a sine that crosses zero where cycles x time + phase is half a whole number."""
    return np.asarray(np.sin(2.0 * np.pi * (cycles_per_day * (mjd - BEGIN_MJD) + phase)))


@settings(derandomize=True, deadline=None)
@given(cycles_per_day=cycles, phase=phases)
def test_every_zero_of_a_wave_is_found(cycles_per_day: float, phase: float) -> None:
    found = crossings(lambda mjd: wave(cycles_per_day, phase, mjd), BEGIN_MJD, END_MJD)
    halves = np.arange(0, 2.0 * (cycles_per_day + 1.0) + 1.0)
    expected = BEGIN_MJD + (halves / 2.0 - phase) / cycles_per_day
    # A zero at an end may fall on either side of it.
    inside = expected[
        (expected > BEGIN_MJD + HALF_SECOND_DAYS) & (expected < END_MJD - HALF_SECOND_DAYS)
    ]
    times = np.array([each.mjd for each in found])
    for zero in inside:
        assert np.abs(times - zero).min() <= HALF_SECOND_DAYS
    assert len(inside) <= len(found) <= len(inside) + 2


@settings(derandomize=True, deadline=None)
@given(cycles_per_day=cycles, phase=phases)
def test_rising_and_falling_take_turns(cycles_per_day: float, phase: float) -> None:
    found = crossings(lambda mjd: wave(cycles_per_day, phase, mjd), BEGIN_MJD, END_MJD)
    assert all(a.rising is not b.rising for a, b in pairwise(found))
    assert all(a.mjd < b.mjd for a, b in pairwise(found))
    for each in found:
        after = wave(cycles_per_day, phase, np.array([each.mjd + HALF_SECOND_DAYS]))
        assert bool(after[0] > 0.0) is each.rising


@settings(derandomize=True, deadline=None)
@given(cycles_per_day=cycles, phase=phases)
def test_spans_are_where_the_quantity_is_positive(cycles_per_day: float, phase: float) -> None:
    spans = spans_above(lambda mjd: wave(cycles_per_day, phase, mjd), BEGIN_MJD, END_MJD)
    edges = [edge for span in spans for edge in span]
    assert edges == sorted(edges)
    # Away from the edges, by more than they can be wrong.
    grid = np.linspace(BEGIN_MJD, END_MJD, 2003)
    if edges:
        grid = grid[np.abs(grid[:, None] - np.array(edges)).min(axis=1) > 2.0 * HALF_SECOND_DAYS]
    inside = np.zeros(grid.shape, dtype=bool)
    for begin, end in spans:
        inside |= (grid > begin) & (grid < end)
    assert np.array_equal(inside, wave(cycles_per_day, phase, grid) > 0.0)


def test_what_never_changes_has_no_crossing() -> None:
    assert crossings(lambda mjd: np.ones_like(mjd), BEGIN_MJD, END_MJD) == []
    assert crossings(lambda mjd: np.full_like(mjd, np.nan), BEGIN_MJD, END_MJD) == []
    assert spans_above(lambda mjd: np.ones_like(mjd), BEGIN_MJD, END_MJD) == [(BEGIN_MJD, END_MJD)]
    assert spans_above(lambda mjd: -np.ones_like(mjd), BEGIN_MJD, END_MJD) == []


lengths_s = st.floats(10.0, 1200.0)
middles = st.floats(0.0, 1.0)


@settings(derandomize=True, deadline=None)
@given(length_s=lengths_s, middle=middles, sign=st.sampled_from((1.0, -1.0)))
def test_a_smooth_event_is_seen_however_short(length_s: float, middle: float, sign: float) -> None:
    """A cosine a day long, like an altitude, that is above (or below) zero for so many seconds."""
    half_days = length_s / 2.0 / 86400.0
    middle_mjd = BEGIN_MJD + middle * (END_MJD - BEGIN_MJD)

    def altitude(mjd: Floats) -> Floats:
        level = np.cos(2.0 * np.pi * half_days)
        return np.asarray(sign * (np.cos(2.0 * np.pi * (mjd - middle_mjd)) - level))

    found = crossings(altitude, BEGIN_MJD, END_MJD)
    edges_mjd = np.array([middle_mjd - half_days, middle_mjd + half_days])
    # Where it comes a day before or after the whole of it may lie outside.
    edges_mjd = np.concatenate([edges_mjd - 1.0, edges_mjd, edges_mjd + 1.0])
    sure = (edges_mjd > BEGIN_MJD + HALF_SECOND_DAYS) & (edges_mjd < END_MJD - HALF_SECOND_DAYS)
    times = np.array([each.mjd for each in found])
    for edge_mjd in edges_mjd[sure]:
        assert np.abs(times - edge_mjd).min() <= HALF_SECOND_DAYS


def test_the_step_bounds_how_short_an_event_with_corners_may_be() -> None:
    """As promised: a minute above zero is seen with a step of half of one, not with one of ten."""

    def peak(mjd: Floats) -> Floats:
        return np.asarray(0.5 / 1440.0 - np.abs(mjd - (BEGIN_MJD + 12.0 / 1440.0 + 0.5)))

    assert len(crossings(peak, BEGIN_MJD, END_MJD, 0.5 / 1440.0)) == 2
    assert crossings(peak, BEGIN_MJD, END_MJD, 10.0 / 1440.0) == []


def test_a_step_longer_than_the_span_still_sees_both_ends() -> None:
    found = crossings(lambda mjd: mjd - (BEGIN_MJD + 0.25), BEGIN_MJD, BEGIN_MJD + 0.5, 5.0)
    assert [each.mjd for each in found] == pytest.approx([BEGIN_MJD + 0.25], abs=HALF_SECOND_DAYS)
    assert found[0].rising
