"""What is done to the night log on purpose, and what came of it: for the tests and the bench.

An entry is *lost* when it was acknowledged and is not read back as it was; *invented* when
something is read that nobody wrote, or a changed value is used and nothing says so.
"""

from __future__ import annotations

import contextlib
import errno
import fcntl
import multiprocessing
import os
import random
import resource
import struct
import subprocess
import sys
import time
from collections.abc import Iterable, Iterator
from dataclasses import dataclass
from multiprocessing.connection import Connection
from pathlib import Path

from engine.clock import HandClock
from engine.errors import LogError
from engine.log import Disk, Event, Follower, LogReading, LogWorker, Note, Recovery, read_log
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


# Kill -9


def event_number(n: int) -> Note:
    """Return the entry that the victim writes under a number: the same for everybody."""
    return Note(text=f"{n} {'abc' * (n * 37 % 400)}", target="KR 12").stamped(n, at(600))


class PiecemealDisk(Disk):
    """A slow disk that takes a few bytes at a time, so that a kill can fall into an entry."""

    def write(self, fd: int, data: bytes) -> int:
        """Write at most 61 bytes, and take a moment for it."""
        time.sleep(0.0005)
        return super().write(fd, data[:61])


class UnsyncedDisk(Disk):
    """A disk that is never asked to sync: what that costs, and what it is worth."""

    def sync(self, fd: int) -> None:
        """Do nothing."""


def victim(folder: Path, acknowledge: Connection, disk: Disk) -> None:
    """Append for ever, and say of each entry that it is on disk: until killed."""
    log = open_log(folder, disk)
    worker = LogWorker(
        log, HandClock(at(600)), lambda event: acknowledge.send_bytes(event.n.to_bytes(4, "big"))
    )
    n = log.next_n
    while True:
        for _ in range(6):
            assert worker.submit(event_number(n)).n == n
            n += 1
        worker.drain(PATIENCE_S)


def kill_often(kills: int, folder: Path, seed: int, a_night: int = 12) -> Tally:
    """Kill a writer without warning, so many times, and let the next take up what it left.

    A few kills a night; each night is read after each kill. Entries handed over but not yet
    acknowledged may be there or not: they are neither lost nor invented.
    """
    context = multiprocessing.get_context("forkserver")
    context.set_forkserver_preload(["tests.faults.log_faults"])
    chance = random.Random(seed)
    tally = Tally("kill -9")
    for count in range(kills):
        here = folder / str(count // a_night)
        if count % a_night == 0:
            here.mkdir()
            acknowledged: set[int] = set()
        mine, theirs = context.Pipe(duplex=False)
        disk = PiecemealDisk() if count % 2 else Disk()
        child = context.Process(target=victim, args=(here, theirs, disk), daemon=True)
        child.start()
        theirs.close()
        # Some die while they open the log, most while they write.
        if chance.random() < 0.8:
            mine.poll(PATIENCE_S)
        time.sleep(chance.random() * 0.03)
        child.kill()
        child.join()
        acknowledged |= _heard(mine)
        _count_kill(tally, here / NAME, acknowledged)
        child.close()
    return tally


def _heard(pipe: Connection) -> set[int]:
    """Return the numbers that a dead child acknowledged, and close its pipe."""
    numbers: set[int] = set()
    with contextlib.suppress(EOFError), pipe:
        while True:
            numbers.add(int.from_bytes(pipe.recv_bytes(), "big"))
    return numbers


def _count_kill(tally: Tally, path: Path, acknowledged: set[int]) -> None:
    tally.tried += 1
    tally.acknowledged += len(acknowledged)
    try:
        found = {event.n: event for event in read_log(path).events}
    except LogError:
        # It died before there was a log.
        found = {}
    tally.lost += sum(found.get(n) != event_number(n) for n in acknowledged)
    tally.invented += sum(
        event != event_number(n) for n, event in found.items() if not isinstance(event, Recovery)
    )


# Power that fails

# ioctl number and flag of ext4: stop at once, and write nothing more, not even the journal.
EXT4_SHUTDOWN = 0x8004587D
WITHOUT_JOURNAL = struct.pack("I", 2)


def cut_power(cuts: int, folder: Path, seed: int, disk: Disk, a_disk: int = 10) -> Tally | None:
    """Stop a file system dead under a writer, again and again; None where none can be mounted.

    Whatever was not synced is gone with the next mount, as after a power cut (but for what a drive
    itself holds back). A fresh file system every so many cuts.
    """
    context = multiprocessing.get_context("forkserver")
    context.set_forkserver_preload(["tests.faults.log_faults"])
    chance = random.Random(seed)
    tally = Tally("power cut" if type(disk) is Disk else "power cut, log never synced")
    image, mounted = folder / "image", folder / "mounted"
    mounted.mkdir()
    for count in range(cuts):
        if count % a_disk == 0:
            image.write_bytes(b"")
            os.truncate(image, 16 << 20)
            if not _runs("mkfs.ext4", "-q", "-F", str(image)):
                return None
            acknowledged: set[int] = set()
        if not _runs("mount", "-o", "loop", str(image), str(mounted)):
            return None
        mine, theirs = context.Pipe(duplex=False)
        child = context.Process(target=victim, args=(mounted, theirs, disk), daemon=True)
        child.start()
        theirs.close()
        mine.poll(PATIENCE_S)
        time.sleep(chance.random() * 0.05)
        fd = os.open(mounted, os.O_RDONLY)
        fcntl.ioctl(fd, EXT4_SHUTDOWN, WITHOUT_JOURNAL)
        os.close(fd)
        child.kill()
        child.join()
        acknowledged |= _heard(mine)
        child.close()
        _runs("umount", str(mounted))
        if not _runs("mount", "-o", "loop", str(image), str(mounted)):
            raise AssertionError("the file system can't be mounted again")
        try:
            _count_kill(tally, mounted / NAME, acknowledged)
        finally:
            _runs("umount", str(mounted))
        if tally.lost:
            # Only without the sync: then the numbers begin anew, and there is nothing to go on.
            break
    return tally


def _runs(*command: str) -> bool:
    try:
        return subprocess.run(command, capture_output=True, check=False).returncode == 0
    except FileNotFoundError:
        return False


# A disk that is full


@contextlib.contextmanager
def small_disk(folder: Path, size: str) -> Iterator[Path | None]:
    """Mount a memory disk of a size; None where this user may not mount."""
    folder.mkdir()
    mounted = subprocess.run(
        ["mount", "-t", "tmpfs", "-o", f"size={size}", "warmroom-test", str(folder)],
        capture_output=True,
        check=False,
    )
    try:
        yield folder if mounted.returncode == 0 else None
    finally:
        if mounted.returncode == 0:
            subprocess.run(["umount", "--lazy", str(folder)], check=True)


def fill_disk(disk: Path) -> Tally:
    """Write until a small disk is full, go on, make room, and see that everything is there."""
    tally = Tally("disk full, room made, 5 times")
    worker, told = _patient_worker(disk)
    handed: list[Event] = []
    for _ in range(5):
        (disk / "ballast").write_bytes(bytes(_room(disk) - 3 * 4096))
        while worker.trouble is None:
            handed.append(worker.submit(Note(text="x" * 900)))
            worker.drain(0.05)
        handed += [worker.submit(Note(text=f"{count}")) for count in range(3)]
        on_disk = len(handed) - worker.unwritten
        tally.count(handed[:on_disk], read_log(disk / NAME).events)
        (disk / "ballast").unlink()
        assert worker.drain(PATIENCE_S)
    assert worker.close()
    assert "make room" in (told[0] or "")
    found = read_log(disk / NAME)
    tally.count(handed, found.events)
    tally.invented += len(found.findings)
    return tally


def _room(disk: Path) -> int:
    known = os.statvfs(disk)
    return known.f_bavail * known.f_bsize


def _patient_worker(folder: Path) -> tuple[LogWorker, list[str | None]]:
    told: list[str | None] = []
    clock = HandClock(at(600))
    return LogWorker(open_log(folder), clock, on_trouble=told.append, retry_s=0.01), told


def reach_size_limit(folder: Path) -> Tally:
    """As a full disk, by the limit the kernel sets on a process's files; run in a child."""
    tally = Tally("file size limit, then lifted")
    worker, told = _patient_worker(folder)
    unlimited = resource.getrlimit(resource.RLIMIT_FSIZE)
    handed: list[Event] = []
    for step in range(1, 6):
        size = (folder / NAME).stat().st_size + 777 * step
        resource.setrlimit(resource.RLIMIT_FSIZE, (size, unlimited[1]))
        while worker.trouble is None:
            handed.append(worker.submit(Note(text="x" * 50 * step)))
            worker.drain(0.05)
        on_disk = len(handed) - worker.unwritten
        tally.count(handed[:on_disk], read_log(folder / NAME).events)
        resource.setrlimit(resource.RLIMIT_FSIZE, unlimited)
        assert worker.drain(PATIENCE_S)
    assert worker.close()
    assert "make room" in (told[0] or "")
    tally.count(handed, read_log(folder / NAME).events)
    return tally


def in_a_child(call: str, *arguments: Path) -> Tally:
    """Run one of the functions here in a process of its own and return its tally."""
    code = (
        "import sys; from pathlib import Path; from tests.faults import log_faults as f\n"
        f"t = f.{call}(*map(Path, sys.argv[1:]))\n"
        "print(t.fault, t.tried, t.acknowledged, t.lost, t.invented, sep='|')"
    )
    done = subprocess.run(
        [sys.executable, "-c", code, *map(str, arguments)],
        capture_output=True,
        text=True,
        check=False,
    )
    assert done.returncode == 0, done.stderr
    fault, *numbers = done.stdout.strip().split("|")
    return Tally(fault, *map(int, numbers))


# Disks that fail


class CapriciousDisk(Disk):
    """A disk on which any call may fail with any error, before or after it took effect."""

    NUMBERS = (errno.EIO, errno.ENOSPC, errno.EROFS, errno.EDQUOT)

    def __init__(self, seed: int, share: float) -> None:
        self._chance = random.Random(seed)
        self.share = share

    def _fails(self, share: float = 1.0) -> None:
        if self._chance.random() < self.share * share:
            number = self._chance.choice(self.NUMBERS)
            raise OSError(number, os.strerror(number))

    def write(self, fd: int, data: bytes) -> int:
        """Fail at once, or write a part only, or all."""
        self._fails()
        part = self._chance.random() < self.share
        return super().write(fd, data[: self._chance.randrange(1, len(data) + 1)] if part else data)

    def sync(self, fd: int) -> None:
        """Sync or fail."""
        self._fails()
        super().sync(fd)

    def truncate(self, fd: int, size: int) -> None:
        """Fail, or truncate, or truncate and fail."""
        self._fails(0.5)
        super().truncate(fd, size)
        self._fails(0.5)

    def link(self, source: Path, path: Path) -> None:
        """Fail, or link, or link and fail."""
        self._fails(0.5)
        super().link(source, path)
        self._fails(0.5)

    def replace(self, source: Path, path: Path) -> None:
        """Fail, or replace, or replace and fail."""
        self._fails(0.5)
        super().replace(source, path)
        self._fails(0.5)

    def sync_folder(self, folder: Path) -> None:
        """Sync or fail."""
        self._fails()
        super().sync_folder(folder)


def fail_at_random(nights: int, folder: Path, seed: int, entries: int = 40) -> Tally:
    """Write nights on disks whose every call may fail, reading what is acknowledged all along."""
    tally = Tally("any call failing, at random")
    for count in range(nights):
        here = folder / str(count)
        here.mkdir()
        log = open_log(here)
        log._disk = disk = CapriciousDisk(seed + count, 0.3)
        done: list[Event] = []
        for n in range(1, entries + 1):
            while len(done) < n:
                with contextlib.suppress(OSError):
                    done.append(log.append(event_number(n)))
                tally.count(done, read_log(here / NAME).events, event_number(n))
        disk.share = 0.0
        log.close()
        again = open_log(here)
        again.close()
        tally.count(done, again.events)
        tally.lost += (here / NAME).read_bytes() != log_bytes(done)
    return tally


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
