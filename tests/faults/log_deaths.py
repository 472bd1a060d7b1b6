"""Writers that die: killed without warning, or as the power of their disk fails."""

from __future__ import annotations

import contextlib
import fcntl
import multiprocessing
import os
import random
import struct
import subprocess
import time
from multiprocessing.connection import Connection
from pathlib import Path

from engine.clock import HandClock
from engine.errors import LogError
from engine.log import Disk, LogWorker, Recovery, read_log
from tests.engine.log_nights import NAME, at, open_log
from tests.faults.log_faults import PATIENCE_S, Tally, event_number

# Kill -9


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
    context.set_forkserver_preload(["tests.faults.log_deaths"])
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


def _heard_so_far(pipe: Connection) -> set[int]:
    """Return the numbers that a child has acknowledged by now."""
    numbers: set[int] = set()
    with contextlib.suppress(EOFError):
        while pipe.poll():
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
    itself holds back). A fresh file system every so many cuts. What the writer says after the cut
    does not count: with the power gone it would say nothing, and a sync under way when the journal
    is stopped may come back without an error.
    """
    context = multiprocessing.get_context("forkserver")
    context.set_forkserver_preload(["tests.faults.log_deaths"])
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
        acknowledged |= _heard_so_far(mine)
        fcntl.ioctl(fd, EXT4_SHUTDOWN, WITHOUT_JOURNAL)
        os.close(fd)
        child.kill()
        child.join()
        mine.close()
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
