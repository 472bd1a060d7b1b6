"""Disks that are full, or fail whenever they like."""

from __future__ import annotations

import contextlib
import errno
import os
import random
import resource
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

from engine.clock import HandClock
from engine.log import Disk, Event, LogWorker, Note, read_log
from tests.engine.log_nights import NAME, at, log_bytes, open_log
from tests.faults.log_faults import PATIENCE_S, Tally, event_number

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
        "import sys; from pathlib import Path; from tests.faults import log_disks as f\n"
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
