"""A terminal that stalls doesn't stop the night; one that is gone, or a signal, ends it cleanly."""

from __future__ import annotations

import fcntl
import os
import pty
import re
import select
import signal
import struct
import subprocess
import sys
import termios
import threading
import time
from collections.abc import Callable, Iterator
from contextlib import suppress
from pathlib import Path

import pyte
import pytest

from tests.tui.steady_app import ONCE
from tui.look.terminal import MOST_WAITING_BYTES, FrameWriter

COLUMNS, ROWS = 100, 30
PATIENCE_S = 15.0


class Peer:
    """The far end of a terminal on which a small app runs; it reads only when asked to."""

    def __init__(self, told: Path, *words: str) -> None:
        self.told = told
        self.screen = pyte.Screen(COLUMNS, ROWS)
        self._stream = pyte.ByteStream(self.screen)
        self.ours, self.theirs = pty.openpty()
        fcntl.ioctl(self.theirs, termios.TIOCSWINSZ, struct.pack("HHHH", ROWS, COLUMNS, 0, 0))
        self.modes = termios.tcgetattr(self.theirs)
        self.child = subprocess.Popen(
            [sys.executable, "-m", "tests.tui.steady_app", str(told), *words],
            stdin=self.theirs,
            stdout=self.theirs,
            stderr=self.theirs,
            start_new_session=True,
            env={
                **{k: v for k, v in os.environ.items() if k not in ("COLUMNS", "LINES")},
                "TERM": "xterm-256color",
            },
        )

    def lines(self) -> list[str]:
        """Return what the app has told so far."""
        return self.told.read_text(encoding="utf-8").splitlines() if self.told.exists() else []

    def count(self) -> int:
        """Return how far the app has counted."""
        return sum(line.startswith("count") for line in self.lines())

    def read(self, for_s: float = 0.05) -> int:
        """Take in what the app draws for a while; return how many bytes."""
        until, taken = time.monotonic() + for_s, 0
        while (left := until - time.monotonic()) > 0:
            if not select.select([self.ours], [], [], left)[0]:
                break
            with suppress(OSError):
                data = os.read(self.ours, 65536)
                taken += len(data)
                self._stream.feed(data)
        return taken

    def wait(self, until: Callable[[], bool], *, reading: bool = True) -> None:
        """Wait until something is so; AssertionError with the screen when it never is."""
        end = time.monotonic() + PATIENCE_S
        while time.monotonic() < end:
            if until():
                return
            if reading:
                self.read()
            else:
                time.sleep(0.05)
        raise AssertionError("\n".join([*self.screen.display, *self.lines()[-3:]]))

    def ended(self) -> bool:
        """Say whether the app has ended."""
        return self.child.poll() is not None

    def hang_up(self) -> None:
        """Close the terminal, as a lost connection does."""
        for each in (self.ours, self.theirs):
            with suppress(OSError):
                os.close(each)

    def close(self) -> None:
        """Let everything go."""
        if not self.ended():
            self.child.kill()
        self.child.wait(10)
        self.hang_up()


@pytest.fixture
def told(tmp_path: Path) -> Path:
    """Return the file in which the app says what it does."""
    return tmp_path / "told"


@pytest.fixture
def peer(told: Path, request: pytest.FixtureRequest) -> Iterator[Peer]:
    """Return the far end of a running app's terminal."""
    far = Peer(told, *getattr(request, "param", ()))
    try:
        far.wait(lambda: far.count() > 5)
        yield far
    finally:
        far.close()


@pytest.mark.parametrize("number", [signal.SIGTERM, signal.SIGHUP])
def test_a_signal_ends_it_with_the_terminal_as_it_was(peer: Peer, number: signal.Signals) -> None:
    """The app is told, ends with the signal's status, and the terminal echoes again."""
    raw = termios.tcgetattr(peer.theirs)
    assert not raw[3] & termios.ECHO
    peer.child.send_signal(number)
    peer.wait(peer.ended)
    assert peer.child.returncode == 128 + number
    assert peer.lines()[-1].startswith(f"leave {128 + number} told to end ({number.name})")
    assert termios.tcgetattr(peer.theirs) == peer.modes
    peer.read()
    assert "Traceback" not in "\n".join(peer.screen.display)


@pytest.mark.parametrize("peer", [("deaf",)], indirect=True)
def test_a_hang_up_ends_it_where_sighup_is_ignored(peer: Peer) -> None:
    """With the terminal gone the app leaves by itself, soon, and does not spin."""
    peer.hang_up()
    peer.wait(peer.ended, reading=False)
    assert peer.child.returncode == 128 + signal.SIGHUP
    assert peer.lines()[-1].endswith("the terminal is gone")


def test_a_stalled_terminal_does_not_stop_it(peer: Peer) -> None:
    """Nobody reads for a while: it counts on, and what is then read ends at the newest count."""
    before = peer.count()
    assert before < ONCE / 2
    peer.wait(lambda: peer.count() > 2 * ONCE, reading=False)

    def is_up_to_date() -> bool:
        shown = {int(n) for n in re.findall(r"count (\d+);", "\n".join(peer.screen.display))}
        # What changed once, in a frame that was dropped, is there too: all was painted again.
        return (
            len(shown) == 1 and min(shown) > 2 * ONCE and f"past {ONCE}" in peer.screen.display[0]
        )

    peer.wait(is_up_to_date)


def test_a_stalled_terminal_can_be_left(peer: Peer) -> None:
    """A terminal that never reads again holds up nobody who ends the app."""
    before = peer.count()
    peer.wait(lambda: peer.count() > before + 80, reading=False)
    peer.child.send_signal(signal.SIGTERM)
    peer.wait(peer.ended, reading=False)
    assert peer.child.returncode == 128 + signal.SIGTERM
    assert termios.tcgetattr(peer.theirs) == peer.modes


def test_frames_wait_within_a_limit_and_modes_are_kept() -> None:
    """A blocked descriptor: memory is bounded, modes arrive in order, then a repaint is asked."""
    reader, writer = os.pipe()
    caught_up = threading.Event()
    frames = FrameWriter(writer, caught_up.set)
    frames.start()
    frame = "x" * 10_000
    # More than a pipe (64 kB) and all that may wait can hold.
    for number in range(60):
        frames.send(frame)
        if number in (0, 30, 59):
            frames.send(f"<mode {number}>", must=True)
        assert frames.waiting_bytes <= MOST_WAITING_BYTES + len(frame) + 100
    assert not caught_up.is_set()
    got = b""
    while not caught_up.is_set():
        if select.select([reader], [], [], 0.05)[0]:
            got += os.read(reader, 65536)
    frames.send("<after>")
    frames.end()
    os.close(writer)
    while data := os.read(reader, 65536):
        got += data
    os.close(reader)
    assert re.findall(rb"<[^>]+>", got) == [b"<mode 0>", b"<mode 30>", b"<mode 59>", b"<after>"]
    # Whole frames only, and far fewer than were sent.
    assert got.count(b"x") % len(frame) == 0
    assert got.count(b"x") < 30 * len(frame)


def test_a_descriptor_that_is_gone_ends_the_writer_quietly() -> None:
    """Nobody reads the pipe any more: the thread ends, later frames are of no consequence."""
    reader, writer = os.pipe()
    os.close(reader)
    frames = FrameWriter(writer, lambda: None)
    frames.start()
    frames.send("nobody sees this")
    frames.join(5.0)
    assert not frames.is_alive()
    frames.send("nor this")
    assert frames.waiting_bytes == 0
    os.close(writer)
