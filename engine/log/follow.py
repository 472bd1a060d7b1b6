"""Looking on while somebody else writes: reads what was added, locks nothing, changes nothing.

It asks for the file's size now and then and reads only what is new; watching for changes by the
kernel's means sees nothing over a network disk.
"""

from __future__ import annotations

import os
from pathlib import Path

from engine.errors import Fault, LogError
from engine.log.blocks import split_blocks
from engine.log.events import Amendment, Event
from engine.log.keys import from_values
from engine.log.reader import LogReading, read_log_bytes
from engine.log.state import NightState, fold

# How much of what was read last is compared, to notice that the file was changed under us.
MEMORY_BYTES = 512


class Follower:
    """A night's log as it grows; call `poll` about twice a second.

    ``state`` is the night so far, ``reading`` the last full reading of the file, ``trouble`` why
    there is nothing new to be had (no log yet, a log that was taken away), None when all is well.
    """

    def __init__(self, path: Path) -> None:
        self.path = path
        self.state = NightState()
        self.reading: LogReading | None = None
        self.trouble: str | None = None
        self._file = (0, 0)
        self._mtime_ns = -1
        self._size = -1
        self._end = 0
        self._line = 1
        self._memory = b""

    @property
    def findings(self) -> tuple[Fault, ...]:
        """What was not right about the log when it was last read in full."""
        return self.reading.findings if self.reading else ()

    def poll(self) -> bool:
        """Read what is new; return whether the state has changed. Never raises for a bad log."""
        try:
            with self.path.open("rb") as file:
                return self._look(file.fileno())
        except OSError as error:
            self.trouble = f"{self.path}: {error.strerror}"
        except LogError as error:
            self.trouble = str(error)
        return False

    def _look(self, fd: int) -> bool:
        now = os.fstat(fd)
        is_same_file = (now.st_dev, now.st_ino) == self._file
        if is_same_file and (now.st_size, now.st_mtime_ns) == (self._size, self._mtime_ns):
            self.trouble = None
            return False
        grew = is_same_file and now.st_size >= self._end and self._remembers(fd)
        changed = self._read_on(fd) if grew else self._read_anew(fd)
        self._file = (now.st_dev, now.st_ino)
        self._size, self._mtime_ns = now.st_size, now.st_mtime_ns
        self.trouble = None
        return changed

    def _remembers(self, fd: int) -> bool:
        """Say whether the file still holds what was read last, and that reading saw no tear."""
        if self.reading is None or self.reading.torn:
            return False
        begin = self._end - len(self._memory)
        return os.pread(fd, len(self._memory), begin) == self._memory

    def _read_on(self, fd: int) -> bool:
        """Take in the entries that were added; one that is not whole yet waits."""
        data = _rest(fd, self._end)
        taken: list[Event] = []
        end = 0
        last_n = self.state.events[-1].n if self.state.events else 0
        for block in split_blocks(data, self._end, self._line):
            if not block.is_finished:
                # A tear, or an entry being written; if a later one is whole, damage after all.
                continue
            event = from_values(block.kind, block.values or {})
            is_next = event.n == last_n + 1 + len(taken)
            if not block.is_sound or not is_next or data[end : block.offset - self._end].strip():
                return self._read_anew(fd)
            taken.append(event)
            end = block.end - self._end
        self._remember(data[:end])
        self.state = _with(self.state, taken)
        return bool(taken)

    def _read_anew(self, fd: int) -> bool:
        data = _rest(fd, 0)
        reading = read_log_bytes(self.path, data)
        before = self.state.events
        self._end, self._line, self._memory = 0, 1, b""
        self._remember(data[: reading.sound_end])
        self.reading = reading
        if reading.events != before:
            self.state = fold(reading.events)
        return reading.events != before

    def _remember(self, data: bytes) -> None:
        self._end += len(data)
        self._line += data.count(b"\n")
        self._memory = (self._memory + data)[-MEMORY_BYTES:]


def _with(state: NightState, events: list[Event]) -> NightState:
    """Return the state after more events; folded only once when any of them amends."""
    if any(isinstance(event, Amendment) for event in events):
        return fold((*state.events, *events))
    for event in events:
        state = state.after(event)
    return state


def _rest(fd: int, begin: int) -> bytes:
    parts = []
    while part := os.pread(fd, 1 << 20, begin):
        parts.append(part)
        begin += len(part)
    return b"".join(parts)
