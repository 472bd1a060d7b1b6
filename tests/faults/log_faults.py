"""What is done to the night log on purpose, and what came of it: for the tests and the bench.

An entry is *lost* when it was acknowledged and is not read back as it was; *invented* when
something is read that nobody wrote, or a changed value is used and nothing says so.
"""

from __future__ import annotations

import random
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from pathlib import Path

from engine.errors import LogError
from engine.log import Event, Follower, LogReading, Note, Recovery, read_log
from engine.log.header import header_bytes
from engine.log.reader import read_log_bytes
from tests.engine.log_nights import (
    NAME,
    at,
    blocks_of,
    exposure,
    header,
    log_bytes,
    open_log,
    read_plainly,
)

PATIENCE_S = 10.0


@dataclass
class Tally:
    """How often a fault was tried, and how many entries were acknowledged, lost and invented."""

    fault: str
    tried: int = 0
    acknowledged: int = 0
    lost: int = 0
    invented: int = 0

    def count(
        self, acknowledged: Iterable[Event], read: Iterable[Event], handed_over: Event | None = None
    ) -> None:
        """Compare what was acknowledged with what is read; recoveries are the writer's own.

        What was handed over and not acknowledged may be there or not, but only as it was.
        """
        meant = {event.n: event for event in acknowledged}
        found = {event.n: event for event in read if not isinstance(event, Recovery)}
        self.tried += 1
        self.acknowledged += len(meant)
        self.lost += sum(found.get(n) != event for n, event in meant.items())
        self.invented += sum(n not in meant and event != handed_over for n, event in found.items())


def sample(count: int = 4) -> list[Event]:
    """Return a few entries, exposures and notes in turn, the notes with awkward text."""
    return [
        exposure(n, float(n))
        if n % 2
        else Note(text=f'"{n}"\n[[note]] \\ é \u202e').stamped(n, at(n))
        for n in range(1, count + 1)
    ]


def event_number(n: int) -> Note:
    """Return the entry that is written under a number: the same for everybody."""
    return Note(text=f"{n} {'abc' * (n * 37 % 400)}", target="KR 12").stamped(n, at(600))


# Cuts and changes of bytes


def cut_for_readers(events: list[Event]) -> Tally:
    """Cut a log behind every byte of its last entries and read it."""
    tally = Tally("cut at every byte, read")
    for data, whole in _cuts(events):
        tally.count(whole, read_log_bytes(Path(NAME), data).events)
    return tally


def cut_for_the_writer(events: list[Event], folder: Path, every: int = 1) -> Tally:
    """Cut a log behind every byte (or every so many) of its last entries and take it up again."""
    tally = Tally("cut at every byte, taken up" if every == 1 else f"cut every {every} bytes")
    for count, (data, whole) in enumerate(_cuts(events)):
        if count % every:
            continue
        (folder / NAME).write_bytes(data)
        log = open_log(folder)
        n = log.next_n
        added = log.append(Note(text="goes on").stamped(n, at(601.0)))
        log.close()
        found = read_log(folder / NAME)
        tally.count([*whole, added], found.events)
        tally.invented += bool(found.findings)
        tally.lost += len(read_plainly((folder / NAME).read_bytes())) != len(found.events)
        tally.lost += not _is_kept(data, folder)
        for left in folder.iterdir():
            left.unlink()
    return tally


def _cuts(events: list[Event]) -> Iterator[tuple[bytes, list[Event]]]:
    data = log_bytes(events)
    begin = len(header_bytes(header()))
    ends = [begin + len(blocks_of(events[: count + 1])) for count in range(len(events))]
    for cut in range(begin, len(data) + 1):
        yield data[:cut], [event for event, end in zip(events, ends, strict=True) if end <= cut]


def _is_kept(data: bytes, folder: Path) -> bool:
    """Say whether every byte of a cut log is still in the folder: in the log, or set aside."""
    asides = list(folder.glob(f"{NAME}.torn-*"))
    log = (folder / NAME).read_bytes()
    if not asides:
        return log.startswith(data)
    (aside,) = asides
    offset = int(aside.name.rpartition("-")[2])
    return log[:offset] + aside.read_bytes() == data


def flip_bits(events: list[Event]) -> Tally:
    """Flip every single bit of a log and read it: each must be said, and shown with its line."""
    tally = Tally("one bit flipped, each")
    data = bytearray(log_bytes(events))
    for place in range(8 * len(data)):
        data[place // 8] ^= 1 << place % 8
        found = reading_of(bytes(data))
        data[place // 8] ^= 1 << place % 8
        tally.tried += 1
        tally.acknowledged += len(events)
        tally.invented += found is not None and not found.findings
    return tally


def reading_of(data: bytes) -> LogReading | None:
    """Return what is read of bytes; None when they are said to be no night log, with a line."""
    try:
        return read_log_bytes(Path(NAME), data)
    except LogError as error:
        if not str(error).startswith(f"{NAME}:1: "):
            raise
        return None


# Following


def follow_through_tears(tears: int, folder: Path, seed: int) -> Tally:
    """Follow a log whose writer is torn off in the middle of an entry again and again."""
    tally = Tally("followed through tears")
    chance = random.Random(seed)
    path = folder / NAME
    follower = Follower(path)
    done: list[Event] = []
    for count in range(tears):
        if count % 60 == 0:
            for left in folder.iterdir():
                left.unlink()
            done.clear()
        log = open_log(folder)
        done += log.events[len(done) :]
        for _ in range(chance.randrange(3)):
            done.append(log.append(event_number(log.next_n)))
            _look(follower, tally, done, chance)
        torn = blocks_of([event_number(log.next_n)])
        with path.open("ab", buffering=0) as file:
            file.write(torn[: chance.randrange(1, len(torn) - 1)])
        log.close()
        _look(follower, tally, done, chance, always=True)
    return tally


def _look(
    follower: Follower, tally: Tally, done: list[Event], chance: random.Random, always: bool = False
) -> None:
    if not always and chance.random() < 0.5:
        return
    follower.poll()
    meant = [event for event in done if not isinstance(event, Recovery)]
    tally.count(meant, follower.state.events)
    tally.lost += len(follower.state.events) != len(done)
