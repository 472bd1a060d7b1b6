"""The invented archive is in the log's own format, byte for byte."""

from __future__ import annotations

from pathlib import Path

from engine.log import fold
from engine.log.blocks import block_bytes, split_blocks
from engine.log.reader import read_log_bytes
from tests.bench.archive import Archive, night_bytes


def test_every_entry_is_as_the_writer_writes_it() -> None:
    """Read back and written by the log's own writer, each entry gives the same bytes."""
    name, data = night_bytes(Archive(nights=3, exposures=40), 1)
    reading = read_log_bytes(Path(name), data)
    assert reading.findings == ()
    blocks = split_blocks(data[data.index(b"[[pointing]]") :])
    assert len(blocks) == len(reading.events) > 80
    for block in blocks:
        assert block.values is not None
        assert block_bytes(block.kind, block.values) == b"\n" + block.raw


def test_a_night_has_all_that_a_night_has() -> None:
    """Exposures kept and rejected, measured seeing, time lost, words: something to ask about."""
    states = [
        fold(read_log_bytes(Path(name), data).events)
        for name, data in (night_bytes(Archive(nights=20, exposures=200), n) for n in range(6))
    ]
    outcomes = {each.outcome for state in states for each in state.exposures}
    assert outcomes == {"good", "rejected"}
    assert all(len(state.seeing) > 5 for state in states)
    assert any(state.lost for state in states)
    assert any(state.notes for state in states)
