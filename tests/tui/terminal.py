"""The real program in a pseudo-terminal, seen through a terminal emulator."""

from __future__ import annotations

import fcntl
import os
import pty
import select
import signal
import struct
import subprocess
import sys
import termios
import time
from collections.abc import Callable, Sequence

import pyte

QUIET_S = 0.05


class Terminal:
    """A child process on a terminal of its own, and the screen it has drawn."""

    def __init__(
        self, words: Sequence[str], columns: int = 120, rows: int = 40, **environment: str
    ) -> None:
        self.screen = pyte.Screen(columns, rows)
        self.bytes_read = 0
        self._stream = pyte.ByteStream(self.screen)
        self._ours, theirs = pty.openpty()
        fcntl.ioctl(theirs, termios.TIOCSWINSZ, struct.pack("HHHH", rows, columns, 0, 0))
        self.started_s = time.monotonic()
        self.child = subprocess.Popen(
            [sys.executable, "-m", "tui.command", *words],
            stdin=theirs,
            stdout=theirs,
            stderr=theirs,
            start_new_session=True,
            # COLUMNS and LINES of whoever runs the tests would outweigh the terminal's own size.
            env={
                **{k: v for k, v in os.environ.items() if k not in ("COLUMNS", "LINES")},
                "TERM": "xterm-256color",
                "COLORTERM": "",
                **environment,
            },
        )
        os.close(theirs)

    def text(self) -> str:
        """Return the screen as lines of text."""
        return "\n".join(self.screen.display)

    def read(self, for_s: float = QUIET_S) -> None:
        """Take in what the program draws for a while."""
        until = time.monotonic() + for_s
        while (left := until - time.monotonic()) > 0:
            ready, _, _ = select.select([self._ours], [], [], left)
            if not ready:
                return
            try:
                data = os.read(self._ours, 65536)
            except OSError:
                # The last of the other side has closed the terminal.
                return
            self.bytes_read += len(data)
            self._stream.feed(data)

    def is_drawing(self, for_s: float) -> bool:
        """Say whether the program has drawn something, or does within so many seconds."""
        return bool(select.select([self._ours], [], [], for_s)[0])

    def press(self, keys: str) -> None:
        """Type keys, as bytes a terminal would send."""
        os.write(self._ours, keys.encode())

    def wait_for(self, wanted: str | Callable[[str], bool], timeout_s: float = 30.0) -> str:
        """Read until the screen shows a text (or satisfies a test); return the screen.

        AssertionError with the whole screen when it does not in time.
        """
        shows = wanted if callable(wanted) else lambda text: wanted in text
        until = time.monotonic() + timeout_s
        while time.monotonic() < until:
            self.read()
            if shows(self.text()):
                return self.text()
            if self.child.poll() is not None:
                self.read(0.2)
                break
        raise AssertionError(f"never saw {wanted!r} in {timeout_s:g} s:\n{self.text()}")

    def kill(self) -> None:
        """End the program as a crash would: kill -9, no clean-up."""
        self.child.send_signal(signal.SIGKILL)
        self.child.wait(10)
        self.close()

    def wait(self, timeout_s: float = 20.0) -> int:
        """Wait for the program to end of itself; return its exit status."""
        until = time.monotonic() + timeout_s
        while self.child.poll() is None and time.monotonic() < until:
            self.read()
        return self.child.wait(1)

    def hang_up(self) -> None:
        """Take the terminal away from under the program."""
        os.close(self._ours)

    def close(self) -> None:
        """Let the terminal go, and the program with it if it still runs."""
        if self.child.poll() is None:
            self.child.kill()
            self.child.wait(10)
        os.close(self._ours)
