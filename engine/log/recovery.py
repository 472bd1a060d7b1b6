"""What only the writer does to a log, lock held: set a torn tail aside, and make a file whole.

Nothing that was on the disk is ever destroyed here: a tail is copied before it is cut off, a file
that fails keeps a name beside the one that takes its place.
"""

from __future__ import annotations

import errno
import os
import secrets
from collections.abc import Iterator, Sequence
from pathlib import Path

from engine.log.disk import Disk
from engine.log.events import Event, Recovery

NAMES_TRIED = 100
# Memory sticks and some network disks know no second names: what a link is answered with there.
NO_SECOND_NAMES = (errno.EPERM, errno.ENOTSUP, errno.ENOSYS)


def set_tail_aside(path: Path, fd: int, offset: int, disk: Disk) -> Path:
    """Copy what stands behind an offset to ``NAME.torn-OFFSET``, then cut it off.

    Each step is on the disk before the next. OSError leaves the log as it was.
    """
    tail = os.pread(fd, os.fstat(fd).st_size - offset, offset)
    aside = keep_beside(path, f"torn-{offset}", tail, disk)
    disk.truncate(fd, offset)
    disk.sync(fd)
    return aside


def unnoted_recoveries(path: Path, events: Sequence[Event]) -> list[Recovery]:
    """Return the recovery events that a log still lacks: one for each tail set aside unsaid.

    Looking for the files, and not at what was just done, makes a recovery that was itself cut
    short come out whole the next time.
    """
    said = {event.set_aside for event in events if isinstance(event, Recovery)}
    wanted = []
    for aside in sorted(path.parent.glob(f"{path.name}.torn-*")):
        offset = aside.name.removeprefix(f"{path.name}.torn-").partition("-")[0]
        if aside.name not in said and offset.isdigit():
            wanted.append(
                Recovery(
                    offset=int(offset),
                    removed_bytes=aside.stat().st_size,
                    set_aside=aside.name,
                    why="the last entry was not whole when the log was opened",
                )
            )
    return wanted


def create_whole(path: Path, data: bytes, disk: Disk) -> None:
    """Make a file whole or not at all, never in place of one that is there.

    FileExistsError when there is one. It is written under another name, synced, and then linked: so
    no reader ever sees part of it.
    """
    fresh, fd = write_fresh(path, data, disk)
    try:
        _give_name(fresh, path, data, disk)
    finally:
        os.close(fd)
        fresh.unlink(missing_ok=True)
    disk.sync_folder(path.parent)


def write_fresh(path: Path, data: bytes, disk: Disk) -> tuple[Path, int]:
    """Write data to a file beside a log under a name of its own; return it, open and synced."""
    fresh = path.with_name(f".{path.name}.{secrets.token_hex(4)}.new")
    fd = os.open(fresh, os.O_RDWR | os.O_APPEND | os.O_CREAT | os.O_EXCL | os.O_CLOEXEC, 0o644)
    try:
        disk.write_all(fd, data)
        disk.sync(fd)
    except BaseException:
        os.close(fd)
        fresh.unlink(missing_ok=True)
        raise
    return fresh, fd


def take_place(fresh: Path, path: Path, end: int, disk: Disk) -> None:
    """Let a fresh copy take a log's name; the file that had it stays, as ``NAME.failed-END``.

    On a disk without second names it stays as a copy.
    """
    try:
        for aside in _names(path, f"failed-{end}"):
            try:
                disk.link(path, aside)
            except FileExistsError:
                if not aside.samefile(path):
                    continue
            break
    except OSError as error:
        if error.errno not in NO_SECOND_NAMES:
            raise
        keep_beside(path, f"failed-{end}", path.read_bytes(), disk)
    disk.sync_folder(path.parent)
    disk.replace(fresh, path)
    disk.sync_folder(path.parent)


def take_free_name(fresh: Path, path: Path, disk: Disk) -> None:
    """Let a fresh copy take a log's name, which no file has; FileExistsError when one has."""
    try:
        disk.link(fresh, path)
    except OSError as error:
        if error.errno not in NO_SECOND_NAMES:
            raise
        if path.exists():
            raise FileExistsError(errno.EEXIST, os.strerror(errno.EEXIST)) from None
        disk.replace(fresh, path)
    disk.sync_folder(path.parent)


def sweep(path: Path) -> None:
    """Remove what an earlier opening that was cut short has left of a file it was making."""
    for left in path.parent.glob(f".{path.name}.*.new"):
        left.unlink(missing_ok=True)


def _give_name(fresh: Path, path: Path, data: bytes, disk: Disk) -> None:
    try:
        disk.link(fresh, path)
    except OSError as error:
        if error.errno not in NO_SECOND_NAMES:
            raise
        fd = os.open(path, os.O_WRONLY | os.O_CREAT | os.O_EXCL | os.O_CLOEXEC, 0o644)
        try:
            disk.write_all(fd, data)
            disk.sync(fd)
        finally:
            os.close(fd)


def keep_beside(path: Path, ending: str, data: bytes, disk: Disk) -> Path:
    """Write data to ``NAME.ending``, or to the next free name like it; return where it is."""
    for aside in _names(path, ending):
        try:
            create_whole(aside, data, disk)
        except FileExistsError:
            if aside.read_bytes() != data:
                continue
        break
    return aside


def _names(path: Path, ending: str) -> Iterator[Path]:
    """Return names to try for a file beside a log; OSError when all are taken."""
    yield path.with_name(f"{path.name}.{ending}")
    for count in range(1, NAMES_TRIED):
        yield path.with_name(f"{path.name}.{ending}-{count}")
    raise OSError(errno.EEXIST, f"too many files {path.name}.{ending}")
