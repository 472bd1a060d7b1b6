"""The one writer of a night's log: locked, recovered when opened, appended to and synced.

The file on disk is always the log. What is acknowledged is on the disk; what failed is cut off
again, or, where the disk itself can't be trusted any more, the whole log goes on in a fresh file
under the same name.
"""

from __future__ import annotations

import errno
import os
from pathlib import Path
from typing import Self

from engine.errors import Fault, LogError
from engine.log.blocks import block_bytes
from engine.log.disk import Disk, is_file_at, remedy
from engine.log.events import Event
from engine.log.header import SCHEMA, Header, header_bytes, is_unfinished
from engine.log.keys import from_values, to_values
from engine.log.lock import network_disk, sign, take_lock, unsign
from engine.log.reader import LogReading, read_log_bytes
from engine.log.recovery import (
    create_whole,
    keep_beside,
    set_tail_aside,
    sweep,
    take_free_name,
    take_place,
    unnoted_recoveries,
    write_fresh,
)
from engine.log.values import as_read

OPENING_TRIES = 5


def encoded(event: Event) -> tuple[Event, bytes]:
    """Return a stamped event as a reader of the file will see it, and its block.

    ValueError for an event that can't be written.
    """
    kind, values = to_values(event)
    read = {key: as_read(value) for key, value in values.items()}
    return from_values(kind, read), block_bytes(kind, values)


class NightLog:
    """The log of one night, open for writing by this process alone.

    ``events`` is what it held when it was opened, a recovery included; ``findings`` what was not
    right about it; ``header`` what stands at its head.
    """

    def __init__(self, path: Path, fd: int, disk: Disk, reading: LogReading) -> None:
        self.path = path
        self.header = reading.header
        self.events = reading.events
        self.findings = reading.findings
        self.next_n = max((event.n for event in reading.events), default=0) + 1
        self._fd = fd
        self._disk = disk
        # Everything that is acknowledged, so that no failing disk is needed to write it anew.
        self._whole = bytearray(_contents(fd))
        self._is_spoiled = False
        self._is_doubtful = False

    @classmethod
    def open(cls, folder: Path, header: Header, now_mjd: float, disk: Disk | None = None) -> Self:
        """Open a night's log, making it if there is none.

        Takes the lock, sets a torn tail aside, and goes on behind the last sound entry. LogError
        when another console holds it, or it can't be written; nothing is changed then.
        """
        disk = disk or Disk()
        path = folder / f"{header.night.isoformat()}.toml"
        try:
            fd = _open_locked(path, header, disk)
        except OSError as error:
            raise LogError(
                f"{path}: {error.strerror}; the folder must exist, be writable and have room"
            ) from None
        try:
            sign(path, now_mjd)
            return cls._take_over(path, fd, now_mjd, disk, header)
        except OSError as error:
            os.close(fd)
            raise LogError(f"{path}: {remedy(error)}") from None
        except BaseException:
            os.close(fd)
            raise

    @classmethod
    def _take_over(cls, path: Path, fd: int, now_mjd: float, disk: Disk, header: Header) -> Self:
        data = _contents(fd)
        if is_unfinished(data):
            set_tail_aside(path, fd, 0, disk)
            data = header_bytes(header)
            disk.write_all(fd, data)
            disk.sync(fd)
        reading = read_log_bytes(path, data)
        if reading.schema != SCHEMA:
            raise LogError(f"{path}: schema {reading.schema!r}, this version writes {SCHEMA} only")
        if reading.torn:
            set_tail_aside(path, fd, reading.sound_end, disk)
        log = cls(path, fd, disk, reading)
        log._note_recoveries(now_mjd)
        kind = network_disk(path.parent)
        if kind is not None:
            what = f"it is on a network disk ({kind}), where locks can fail; use a local one"
            log.findings = (*log.findings, Fault(path, 1, "", what))
        return log

    def _note_recoveries(self, now_mjd: float) -> None:
        """Append what the log lacks about tails set aside; failing that, the next opening does."""
        for recovery in unnoted_recoveries(self.path, self.events):
            try:
                done = self.append(recovery.stamped(self.next_n, now_mjd))
            except OSError as error:
                what = (
                    f"{recovery.set_aside} was set aside, which is not yet noted: {error.strerror}"
                )
                self.findings = (*self.findings, Fault(self.path, 1, "", what))
                return
            self.events = (*self.events, done)

    def append(self, event: Event) -> Event:
        """Write one stamped event and return it as it now stands in the file.

        When this returns the event is on disk. OSError when it is not, and then nothing of it is
        in the log: a part that went in is cut off again, at the latest before the next append.
        """
        as_it_stands, block = encoded(event)
        self.append_block(block)
        self.next_n = max(self.next_n, event.n + 1)
        return as_it_stands

    def append_block(self, block: bytes) -> None:
        """Write one encoded event: one write, a sync, and only then does this return."""
        self._make_ready()
        try:
            self._is_spoiled = True
            self._disk.write_all(self._fd, block)
            self._sync()
            if not is_file_at(self._fd, self.path):
                self._is_doubtful = True
                raise FileNotFoundError(errno.ENOENT, "the log's file is not in its place")
        except OSError:
            self._take_back()
            raise
        self._is_spoiled = False
        self._whole += block

    def rescued(self) -> bytes:
        """Return all of the log that was acknowledged, whatever has become of its file."""
        return bytes(self._whole)

    def close(self) -> None:
        """Let the log go; the lock goes with it."""
        unsign(self.path)
        os.close(self._fd)

    def _sync(self) -> None:
        try:
            self._disk.sync(self._fd)
        except OSError as error:
            # After a failed sync the kernel forgets that pages are unwritten: a second sync would
            # succeed and mean nothing. A disk that is only full is another matter.
            self._is_doubtful = error.errno not in (errno.ENOSPC, errno.EDQUOT)
            raise

    def _take_back(self) -> None:
        """Cut off what went in of an entry that failed; if even that fails, `_make_ready` tries."""
        try:
            if os.fstat(self._fd).st_size > len(self._whole):
                self._disk.truncate(self._fd, len(self._whole))
        except OSError:
            return
        self._is_spoiled = False

    def _make_ready(self) -> None:
        """See to it that the file in place is ours and ends where the last acknowledged entry does.

        It can fail to: an append went wrong, or somebody else removed, replaced or changed it.
        """
        if not is_file_at(self._fd, self.path):
            if not self.path.exists():
                self._begin_anew()
                return
            self._go_over_to_the_file_in_place()
            self._reconcile()
        if self._is_doubtful:
            self._begin_anew()
        size = os.fstat(self._fd).st_size
        if self._is_spoiled and size > len(self._whole):
            self._disk.truncate(self._fd, len(self._whole))
        elif size != len(self._whole):
            self._reconcile()
        self._is_spoiled = False

    def _go_over_to_the_file_in_place(self) -> None:
        """Open and lock the file that another program has put in the log's place."""
        fd = os.open(self.path, os.O_RDWR | os.O_APPEND | os.O_CLOEXEC)
        try:
            take_lock(self.path, fd)
        except LogError as error:
            os.close(fd)
            raise OSError(errno.ESTALE, str(error)) from None
        os.close(self._fd)
        self._fd, self._is_spoiled, self._is_doubtful = fd, False, False

    def _reconcile(self) -> None:
        """Go on in a file that another program has changed; nothing of anybody's is cut off.

        One that only grew, or was edited, is taken as it is (as it was is kept beside it, then).
        One that was cut down, or is no log any more, gives its place to the log as it was.
        """
        data = _contents(self._fd)
        if data == self._whole:
            return
        if self._whole.startswith(data) or not _is_log(self.path, data):
            self._begin_anew()
            return
        if not data.startswith(self._whole):
            keep_beside(self.path, f"before-{len(self._whole)}", self.rescued(), self._disk)
        if not data.endswith(b"\n"):
            self._disk.write_all(self._fd, b"\n")
            data += b"\n"
        self._whole = bytearray(data)
        what = "the file was changed by another program while it was open"
        self.findings = (*self.findings, Fault(self.path, data.count(b"\n"), "", what))

    def _begin_anew(self) -> None:
        """Write the whole log to a fresh file and go on in that one.

        It takes the name from the file that can't be trusted, which stays beside it; or the name
        alone, where the file was removed.
        """
        fresh, fd = write_fresh(self.path, self.rescued(), self._disk)
        try:
            take_lock(self.path, fd)
            if is_file_at(self._fd, self.path):
                take_place(fresh, self.path, len(self._whole), self._disk)
            else:
                take_free_name(fresh, self.path, self._disk)
        except BaseException:
            os.close(fd)
            raise
        finally:
            fresh.unlink(missing_ok=True)
        os.close(self._fd)
        self._fd, self._is_spoiled, self._is_doubtful = fd, False, False


def _is_log(path: Path, data: bytes) -> bool:
    try:
        read_log_bytes(path, data)
    except LogError:
        return False
    return True


def _contents(fd: int) -> bytes:
    size, parts, at = os.fstat(fd).st_size, [], 0
    while at < size and (part := os.pread(fd, size - at, at)):
        parts.append(part)
        at += len(part)
    return b"".join(parts)


def _open_locked(path: Path, header: Header, disk: Disk) -> int:
    """Return a night's log, open and locked; made with its header if there was none.

    Between opening and locking the file may lose its name to another: then once more.
    """
    for _ in range(OPENING_TRIES):
        if not path.exists():
            try:
                create_whole(path, header_bytes(header), disk)
            except (FileExistsError, FileNotFoundError):
                # Another console was quicker, and may have swept ours away.
                if path.exists():
                    continue
                raise
        fd = os.open(path, os.O_RDWR | os.O_APPEND | os.O_CLOEXEC)
        try:
            take_lock(path, fd)
            if is_file_at(fd, path):
                sweep(path)
                return fd
        except BaseException:
            os.close(fd)
            raise
        os.close(fd)
    raise OSError(errno.ESTALE, "the file is being replaced by another program all the time")
