"""A follower sees what was added, and starts afresh when the file is no longer what it was."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from engine.log import Amendment, Event, Follower, Note, fold
from tests.engine.log_nights import NAME, at, blocks_of, exposure, log_bytes, open_log


def note(n: int) -> Event:
    """Return a note with a number."""
    return Note(text=f"note {n}").stamped(n, at(n))


def test_it_sees_what_is_added_and_only_reads_that(tmp_path: Path) -> None:
    """A poll without news is False; one with news gives the state folded from the file."""
    log = open_log(tmp_path)
    log.append(note(1))
    follower = Follower(log.path)
    assert follower.poll()
    assert not follower.poll()
    first = follower.reading
    for n in range(2, 8):
        log.append(note(n))
        assert follower.poll()
        assert not follower.poll()
    assert follower.reading is first
    assert follower.state == fold(note(n) for n in range(1, 8))
    log.close()


def test_several_entries_and_amendments_at_once(tmp_path: Path) -> None:
    """Whatever came since the last poll is folded as a whole."""
    path = tmp_path / NAME
    events: list[Event] = [note(1), exposure(2, 3.0)]
    path.write_bytes(log_bytes(events))
    follower = Follower(path)
    follower.poll()
    more = [Amendment(of=2, extra={"outcome": "rejected"}).stamped(3, at(4)), note(4)]
    with path.open("ab") as file:
        file.write(blocks_of(more))
    assert follower.poll()
    assert follower.state == fold([*events, *more])
    assert follower.state.kept == ()


def test_half_an_entry_waits_for_its_other_half(tmp_path: Path) -> None:
    """Byte by byte: never an entry that is not whole, and it is there with its last byte."""
    path = tmp_path / NAME
    path.write_bytes(log_bytes([note(1)]))
    follower = Follower(path)
    assert follower.poll()
    block = blocks_of([note(2)])
    for count in range(len(block)):
        with path.open("ab", buffering=0) as file:
            file.write(block[count : count + 1])
        assert follower.poll() == (count == len(block) - 1)
        assert len(follower.state.events) == (2 if count == len(block) - 1 else 1)
    assert follower.findings == ()


def test_a_follower_that_came_in_the_middle_of_a_write_forgets_the_tear(tmp_path: Path) -> None:
    """It saw half an entry first; once that is whole there is nothing to say any more."""
    path = tmp_path / NAME
    block = blocks_of([note(2)])
    path.write_bytes(log_bytes([note(1)]) + block[:20])
    follower = Follower(path)
    assert follower.poll()
    assert "just being written" in follower.findings[0].what
    with path.open("ab") as file:
        file.write(block[20:])
    assert follower.poll()
    assert follower.findings == ()


@pytest.mark.parametrize("change", ["cut", "edited", "replaced", "damaged", "out of turn"])
def test_a_file_that_changed_is_read_anew(tmp_path: Path, change: str) -> None:
    """Whatever was done to what was read before, the state is that of the file as it is."""
    path = tmp_path / NAME
    events = [note(n) for n in range(1, 6)]
    data = log_bytes(events)
    path.write_bytes(data)
    follower = Follower(path)
    follower.poll()
    if change == "cut":
        os.truncate(path, len(log_bytes(events[:3])))
        expected = events[:3]
    elif change == "edited":
        changed = data.replace(b"note 5", b"note five, as it was meant") + blocks_of([note(6)])
        path.write_bytes(changed)
        expected = [*events[:4], Note(text="note five, as it was meant").stamped(5, at(5)), note(6)]
    elif change == "replaced":
        (tmp_path / "fresh").write_bytes(data + blocks_of([note(6)]))
        (tmp_path / "fresh").rename(path)
        expected = [*events, note(6)]
    elif change == "damaged":
        path.write_bytes(data + b"\n[[note]]\nn = 6\n" + blocks_of([note(7)]))
        expected = [*events, note(7)]
    else:
        path.write_bytes(data + blocks_of([note(9)]))
        expected = [*events, note(9)]
    assert follower.poll()
    assert list(follower.state.events) == expected
    assert bool(follower.findings) == (change in ("edited", "damaged", "out of turn"))


def test_it_waits_for_a_log_and_keeps_what_it_saw_of_one_that_is_gone(tmp_path: Path) -> None:
    """No log yet, then one, then none again, then something else: never an error, always said."""
    path = tmp_path / NAME
    follower = Follower(path)
    assert not follower.poll()
    assert follower.trouble is not None
    assert "No such file" in follower.trouble
    path.write_bytes(log_bytes([note(1)]))
    assert follower.poll()
    assert follower.trouble is None
    path.unlink()
    assert not follower.poll()
    assert follower.trouble is not None
    assert len(follower.state.events) == 1
    path.write_bytes(b"")
    assert not follower.poll()
    assert follower.trouble is not None
    assert "never finished" in follower.trouble
    assert len(follower.state.events) == 1
    path.write_bytes(log_bytes([note(1), note(2)]))
    assert follower.poll()
    assert follower.trouble is None


def test_it_holds_no_lock_and_no_file(tmp_path: Path) -> None:
    """A writer opens the night while a follower looks on."""
    path = tmp_path / NAME
    path.write_bytes(log_bytes([note(1)]))
    follower = Follower(path)
    follower.poll()
    log = open_log(tmp_path)
    log.append(note(2))
    assert follower.poll()
    log.close()
    assert path.read_bytes() == log_bytes([note(1), note(2)])
