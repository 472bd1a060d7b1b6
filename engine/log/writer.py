"""The one writer of a night's log: locked, recovered when opened, appended to and flushed."""

from __future__ import annotations

import contextlib
import fcntl
import getpass
import os
import socket
from pathlib import Path
from typing import Self

from engine.errors import Fault, LogError
from engine.log.blocks import block_bytes
from engine.log.disk import Disk
from engine.log.events import Event, Recovery, from_values, to_values
from engine.log.header import Header, header_bytes
from engine.log.reader import read_log
from engine.times import iso_from_mjd


class NightLog:
    """The log of one night, open for writing by this process alone.

    ``events`` is what it held when it was opened, a recovery included; ``findings`` what was not
    right about it.
    """

    def __init__(
        self,
        path: Path,
        fd: int,
        events: tuple[Event, ...],
        findings: tuple[Fault, ...],
        disk: Disk,
    ) -> None:
        self.path = path
        self.events = events
        self.findings = findings
        self.next_n = max((event.n for event in events), default=0) + 1
        self._fd = fd
        self._disk = disk
        self._end = os.fstat(fd).st_size

    @classmethod
    def open(cls, folder: Path, header: Header, now_mjd: float, disk: Disk | None = None) -> Self:
        """Open a night's log, making it if there is none.

        Takes the lock, sets a torn tail aside, and goes on behind the last sound entry. LogError
        when another console holds it, or the folder can't be written; nothing is changed then.
        """
        disk = disk or Disk()
        path = folder / f"{header.night.isoformat()}.toml"
        try:
            if not path.exists():
                _create(path, header, disk)
            fd = os.open(path, os.O_RDWR | os.O_APPEND | os.O_CLOEXEC)
        except OSError as error:
            raise LogError(
                f"{path}: {error.strerror}; the folder must exist, be writable and have room"
            ) from None
        try:
            _lock(path, fd, now_mjd)
            return cls._take_over(path, fd, now_mjd, disk)
        except BaseException:
            os.close(fd)
            raise

    @classmethod
    def _take_over(cls, path: Path, fd: int, now_mjd: float, disk: Disk) -> Self:
        reading = read_log(path)
        if not reading.torn:
            return cls(path, fd, reading.events, reading.findings, disk)
        aside = _set_tail_aside(path, fd, reading.sound_end, disk)
        log = cls(path, fd, reading.events, reading.findings, disk)
        recovery = Recovery(
            offset=reading.sound_end,
            removed_bytes=reading.torn,
            set_aside=aside.name,
            why="the last entry was not whole when the log was opened",
        )
        done = log.append(recovery.stamped(log.next_n, now_mjd))
        log.events = (*log.events, done)
        return log

    def append(self, event: Event) -> Event:
        """Write one stamped event and return it as it now stands in the file.

        When this returns the event is on disk. OSError when it is not, and then nothing of it is
        in the file: a part that went in is cut off again.
        """
        kind, values = to_values(event)
        data = block_bytes(kind, values)
        try:
            written = self._disk.write(self._fd, data)
            if written != len(data):
                # A full disk takes what fits and says nothing; the next write says why.
                written += self._disk.write(self._fd, data[written:])
            if written != len(data):
                raise OSError(28, os.strerror(28))
            self._disk.sync(self._fd)
        except OSError:
            with contextlib.suppress(OSError):
                self._disk.truncate(self._fd, self._end)
            raise
        self._end += len(data)
        self.next_n = max(self.next_n, event.n + 1)
        return event

    def close(self) -> None:
        """Let the log go; the lock goes with it."""
        _holder_note(self.path).unlink(missing_ok=True)
        os.close(self._fd)


def as_in_file(event: Event) -> Event:
    """Return an event as a reader of the file will see it: times to the millisecond."""
    kind, values = to_values(event)
    return from_values(kind, values)


def _create(path: Path, header: Header, disk: Disk) -> None:
    """Make a log with its header, whole or not at all, never in place of one that is there."""
    fresh = path.with_name(f".{path.name}.{os.getpid()}.new")
    fd = os.open(fresh, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o644)
    try:
        data = header_bytes(header)
        if disk.write(fd, data) != len(data):
            raise OSError(28, os.strerror(28))
        disk.sync(fd)
        with contextlib.suppress(FileExistsError):
            os.link(fresh, path)
    finally:
        os.close(fd)
        fresh.unlink()
    disk.sync_folder(path.parent)


def _lock(path: Path, fd: int, now_mjd: float) -> None:
    """Take the lock or say who has it. The kernel drops it when the process ends, however it does.

    The note beside the log only tells a person who holds it; it decides nothing.
    """
    note = _holder_note(path)
    try:
        fcntl.flock(fd, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except BlockingIOError:
        holder = "another console"
        with contextlib.suppress(OSError, UnicodeDecodeError):
            holder = note.read_text(encoding="utf-8").strip() or holder
        raise LogError(
            f"{path}: this night is open already, by {holder}; close it there, "
            "or look on with 'warmroom follow'"
        ) from None
    with contextlib.suppress(OSError):
        note.write_text(
            f"{getpass.getuser()} on {socket.gethostname()}, process {os.getpid()}, "
            f"since {iso_from_mjd(now_mjd)[:19]}Z\n",
            encoding="utf-8",
        )


def _holder_note(path: Path) -> Path:
    return path.with_name(f".{path.name}.held")


def _set_tail_aside(path: Path, fd: int, offset: int, disk: Disk) -> Path:
    """Copy a torn tail beside the log, then cut it off, each safely on disk before the next."""
    tail = os.pread(fd, os.fstat(fd).st_size - offset, offset)
    aside = path.with_name(f"{path.name}.torn-{offset}")
    copy = os.open(aside, os.O_WRONLY | os.O_CREAT | os.O_TRUNC, 0o644)
    try:
        disk.write(copy, tail)
        disk.sync(copy)
    finally:
        os.close(copy)
    disk.sync_folder(path.parent)
    disk.truncate(fd, offset)
    disk.sync(fd)
    return aside
