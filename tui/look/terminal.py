"""The terminal itself: one that stalls must not stop the night, one that is gone must be left.

Textual's driver waits until the terminal has taken each frame, so a peer that stops reading stops
the event loop and with it the exposure clock; and signals end it with the terminal left raw.
`SteadyDriver` drops frames that can't be sent, paints the whole screen anew when the terminal reads
again, and turns the signals and a hang-up into one message, `MustLeave`, for the app to obey.
"""

from __future__ import annotations

import asyncio
import os
import select
import signal
import threading
from collections import deque
from collections.abc import Callable, Iterable
from typing import TYPE_CHECKING, Any, NamedTuple

from textual.drivers.linux_driver import LinuxDriver
from textual.events import Callback
from textual.message import Message

if TYPE_CHECKING:
    from textual.app import App

# About three full paints of a large screen: behind a slow link, older frames are of no use.
MOST_WAITING_BYTES = 64 * 1024
# How long a terminal that doesn't read may hold up leaving it.
LEAVING_S = 1.0
HANG_UP_CHECK_S = 1.0
# Ends a synchronised update whose own end was dropped: DEC private mode 2026.
_END_OF_UPDATE = b"\x1b[?2026l"
_GONE = select.POLLHUP | select.POLLERR | select.POLLNVAL


class MustLeave(Message):
    """The console has to end now, without asking: why, and the exit status that says so."""

    def __init__(self, why: str, status: int) -> None:
        super().__init__()
        self.why = why
        self.status = status


class _Piece(NamedTuple):
    data: bytes
    must: bool


class FrameWriter(threading.Thread):
    """Sends to a terminal from a thread of its own, and never makes the sender wait.

    When more than ``MOST_WAITING_BYTES`` wait, all frames are dropped until the terminal has taken
    what was on its way; then ``caught_up`` is called, from this thread, to have everything painted
    again. What must be sent (modes of the terminal) is kept, in its order.
    """

    def __init__(self, file_number: int, caught_up: Callable[[], None]) -> None:
        super().__init__(name="terminal-writer", daemon=True)
        self._file_number = file_number
        self._caught_up = caught_up
        self._waiting: deque[_Piece] = deque()
        self._waiting_bytes = 0
        self._behind = False
        self._ended = False
        self._changed = threading.Condition()

    @property
    def waiting_bytes(self) -> int:
        """How much waits to be sent."""
        return self._waiting_bytes

    def send(self, text: str, *, must: bool = False) -> None:
        """Send text soon, or drop it if the terminal doesn't keep up and it need not be sent."""
        piece = _Piece(text.encode("utf-8", "replace"), must)
        with self._changed:
            if self._ended:
                return
            if not must and not self._behind and self._waiting_bytes > MOST_WAITING_BYTES:
                self._behind = True
                self._keep(each for each in tuple(self._waiting) if each.must)
            if must or not self._behind:
                self._waiting.append(piece)
                self._waiting_bytes += len(piece.data)
                self._changed.notify()

    def end(self, wait_s: float = LEAVING_S) -> None:
        """Send what still waits, but give up after a while on a terminal that doesn't read."""
        with self._changed:
            self._ended = True
            self._changed.notify()
        if self.is_alive():
            self.join(wait_s)

    def run(self) -> None:
        """Send piece by piece until ended, or until the terminal is gone."""
        while (piece := self._next()) is not None:
            try:
                self._write(piece.data)
                if self._is_caught_up():
                    self._write(_END_OF_UPDATE)
                    self._caught_up()
            except OSError:
                # The terminal is gone: the driver's own check tells the app.
                with self._changed:
                    self._ended = True
                    self._keep(())
                return

    def _next(self) -> _Piece | None:
        with self._changed:
            while not self._waiting and not self._ended:
                self._changed.wait()
            if not self._waiting:
                return None
            piece = self._waiting.popleft()
            self._waiting_bytes -= len(piece.data)
            return piece

    def _is_caught_up(self) -> bool:
        """Return whether frames were dropped and the terminal has taken all that was kept."""
        with self._changed:
            done = self._behind and not self._waiting and not self._ended
            if done:
                self._behind = False
            return done

    def _keep(self, pieces: Iterable[_Piece]) -> None:
        self._waiting = deque(pieces)
        self._waiting_bytes = sum(len(each.data) for each in self._waiting)

    def _write(self, data: bytes) -> None:
        # Straight to the descriptor: a blocked write through stderr would hold its lock at exit.
        left = memoryview(data)
        while left:
            try:
                left = left[os.write(self._file_number, left) :]
            except BlockingIOError:
                select.select((), (self._file_number,), ())


class SteadyDriver(LinuxDriver):
    """Textual's driver for a night: see the module. The app must handle `MustLeave`."""

    def __init__(self, app: App[Any], **settings: Any) -> None:
        super().__init__(app, **settings)
        self._frames: FrameWriter | None = None
        self._changing_modes = False
        self._check: asyncio.TimerHandle | None = None
        self._is_leaving = False

    def write(self, data: str) -> None:
        """Send a frame; called by Textual for all it draws."""
        if self._frames is not None:
            self._frames.send(data, must=self._changing_modes)

    def start_application_mode(self) -> None:
        """Take the terminal, and watch for what would take it away."""
        assert self._file is not None, "the console needs a terminal on stderr"
        self._frames = FrameWriter(self._file.fileno(), self._paint_anew)
        self._frames.start()
        self._changing_modes = True
        super().start_application_mode()  # type: ignore[no-untyped-call]
        self._changing_modes = False
        loop = asyncio.get_running_loop()
        for number in (signal.SIGHUP, signal.SIGINT, signal.SIGTERM):
            name, status = signal.Signals(number).name, 128 + number
            loop.add_signal_handler(number, self._leave, f"told to end ({name})", status)
        self._look_for_hang_up(loop)

    def stop_application_mode(self) -> None:
        """Give the terminal back as it was."""
        # The signals stay caught until the loop closes, so that a second one cuts nothing short.
        if self._check is not None:
            self._check.cancel()
        self._is_leaving = True
        self._changing_modes = True
        super().stop_application_mode()

    def close(self) -> None:
        """Send what waits, within reason."""
        super().close()
        if self._frames is not None:
            self._frames.end()
            self._frames = None
        self._is_leaving = False

    def run_input_thread(self) -> None:
        """Read keys until the terminal is left or gone."""
        try:
            super().run_input_thread()
        except OSError:
            self._leave("the terminal is gone", 128 + signal.SIGHUP)

    def _look_for_hang_up(self, loop: asyncio.AbstractEventLoop) -> None:
        """Look now and then: where SIGHUP is ignored, a hang-up shows in nothing else."""
        poll = select.poll()
        poll.register(self.fileno, 0)
        if any(events & _GONE for _, events in poll.poll(0)):
            self._leave("the terminal is gone", 128 + signal.SIGHUP)
        else:
            self._check = loop.call_later(HANG_UP_CHECK_S, self._look_for_hang_up, loop)

    def _leave(self, why: str, status: int) -> None:
        if not self._is_leaving:
            self._is_leaving = True
            self.send_message(MustLeave(why, status))

    def _paint_anew(self) -> None:
        def refresh() -> None:
            self._app.refresh()

        if not self._is_leaving:
            self.send_message(Callback(callback=refresh))
