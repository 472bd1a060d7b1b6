"""Logs cut at every byte, and with every single bit flipped: nothing lost, nothing invented."""

from __future__ import annotations

from pathlib import Path

from hypothesis import given, settings
from hypothesis import strategies as st

from engine.log.keys import to_values
from engine.log.writer import encoded
from tests.engine.log_nights import any_event, log_bytes, read_plainly
from tests.faults.log_faults import (
    Tally,
    cut_for_readers,
    cut_for_the_writer,
    flip_bits,
    reading_of,
    sample,
)


def test_cut_at_every_byte_and_read() -> None:
    """Every entry that was whole is read, and nothing else is."""
    tally = cut_for_readers(sample(6))
    assert tally.tried > 2800
    assert (tally.lost, tally.invented) == (0, 0)


def test_cut_and_taken_up_again(tmp_path: Path) -> None:
    """The writer sets the rest aside, goes on, and the file is plain TOML without a finding."""
    tally = cut_for_the_writer(sample(2), tmp_path, every=5)
    assert tally.tried > 180
    assert (tally.lost, tally.invented) == (0, 0)


def test_no_flipped_bit_goes_unseen() -> None:
    """Header, entries, blank lines, crc lines: each of them, one at a time."""
    tally = flip_bits(sample(2))
    assert tally.tried > 10_000
    assert tally.invented == 0


def test_the_tally_itself_counts_what_is_wrong() -> None:
    """A lost, a changed and an invented entry are counted: the tests above can fail."""
    one, two, three = sample(3)
    tally = Tally("itself")
    tally.count([one, two], [one, two.stamped(2, 0.0), three])
    tally.count([one], [])
    assert (tally.tried, tally.acknowledged, tally.lost, tally.invented) == (2, 3, 2, 1)


@settings(max_examples=60, deadline=None)
@given(st.data(), st.integers(1, 8))
def test_any_log_is_plain_toml_with_every_value_as_it_was(data: st.DataObject, count: int) -> None:
    """Whole logs of any entries, read by tomllib and zlib alone: all values equal, crcs right."""
    events = [encoded(data.draw(any_event(n)))[0] for n in range(1, count + 1)]
    plain = read_plainly(log_bytes(events))
    assert plain == [to_values(event) for event in events]
    found = reading_of(log_bytes(events))
    assert found is not None
    assert list(found.events) == events
