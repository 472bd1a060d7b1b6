"""When a target may be observed: the stretches agree with the table of limits, minute by minute."""

from __future__ import annotations

import itertools

import numpy as np
from hypothesis import given
from hypothesis import strategies as st

from engine.logbook import load_logbook, sample_logbook
from engine.night import open_night, reasons_in, runs, stretches
from engine.rehearsal import NIGHT


@given(st.lists(st.booleans(), max_size=60))
def test_runs_are_the_mask(mask: list[bool]) -> None:
    """Filling the runs gives the mask back, and none touches the next."""
    found = runs(np.array(mask, dtype=bool))
    filled = np.zeros(len(mask), dtype=bool)
    for first, after in found:
        assert first < after
        filled[first:after] = True
    assert filled.tolist() == mask
    assert all(one[1] < other[0] for one, other in itertools.pairwise(found))


def test_stretches_of_the_sample_are_free_of_limits() -> None:
    """Each minute inside breaks none; the minute after breaks the limit that is named."""
    night = open_night(load_logbook(sample_logbook()), NIGHT)
    count = 0
    for index in range(len(night.targets)):
        inside = np.zeros(night.mjd.shape, dtype=bool)
        for each in stretches(night, index):
            first, after = night.index_at(each.begin_mjd), night.index_at(each.end_mjd)
            inside[first:after] = True
            count += 1
            assert each.ended_by is not None
            assert each.ended_by == reasons_in(int(night.limits[index, after]))[0]
        assert (inside == (night.limits[index] == 0)).all()
    assert count > 20
