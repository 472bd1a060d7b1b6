"""Appends on a thread of their own, so that a slow or failing disk never holds up the night."""

from __future__ import annotations

import threading
from collections import deque
from collections.abc import Callable

from engine.clock import Clock
from engine.log.events import Event
from engine.log.writer import NightLog, as_in_file

RETRY_S = 2.0


class LogWorker:
    """Numbers, stamps and hands over events; keeps each until the disk has it.

    ``on_written(event)`` is called on the worker's thread once an event is on disk,
    ``on_trouble(text)`` when writing fails (what to do about it) and with None once it works again.
    """

    def __init__(
        self,
        log: NightLog,
        clock: Clock,
        on_written: Callable[[Event], None] = lambda event: None,
        on_trouble: Callable[[str | None], None] = lambda text: None,
    ) -> None:
        self._log = log
        self._clock = clock
        self._on_written = on_written
        self._on_trouble = on_trouble
        self._waiting: deque[Event] = deque()
        self._change = threading.Condition()
        self._next_n = log.next_n
        self._closing = False
        self.trouble: str | None = None
        self._thread = threading.Thread(target=self._work, name="night log", daemon=True)
        self._thread.start()

    @property
    def unwritten(self) -> int:
        """How many events are not yet on disk."""
        return len(self._waiting)

    def submit(self, event: Event) -> Event:
        """Hand an event over; return it numbered and stamped, as the file will have it.

        Raises ValueError for an event that can't be written (a value that is not finite); nothing
        is handed over then.
        """
        with self._change:
            stamped = as_in_file(event.stamped(self._next_n, self._clock.now_mjd()))
            self._next_n += 1
            self._waiting.append(stamped)
            self._change.notify_all()
        return stamped

    def drain(self, timeout_s: float) -> bool:
        """Wait until everything is on disk; return whether it is."""
        with self._change:
            return self._change.wait_for(lambda: not self._waiting, timeout_s)

    def close(self, timeout_s: float = 10.0) -> bool:
        """Write what can be written in a time, then let the log go; return whether all was."""
        done = self.drain(timeout_s)
        with self._change:
            self._closing = True
            self._change.notify_all()
        self._thread.join(timeout_s)
        self._log.close()
        return done

    def _work(self) -> None:
        while True:
            with self._change:
                self._change.wait_for(lambda: self._waiting or self._closing)
                if self._closing:
                    return
                event = self._waiting[0]
            try:
                self._log.append(event)
            except OSError as error:
                self._tell(f"the log can't be written ({error.strerror}): {_remedy(error)}")
                with self._change:
                    self._change.wait_for(lambda: self._closing, RETRY_S)
                continue
            with self._change:
                self._waiting.popleft()
                self._change.notify_all()
            self._tell(None)
            self._on_written(event)

    def _tell(self, trouble: str | None) -> None:
        if trouble != self.trouble:
            self.trouble = trouble
            self._on_trouble(trouble)


def _remedy(error: OSError) -> str:
    """Return what the observer can do about a disk that fails."""
    return {
        28: "make room on the disk; nothing is lost meanwhile",
        30: "the disk is read-only; call the duty staff, and leave the console open",
        13: "the folder's permissions were changed; restore them",
        2: "the folder is gone; put it back",
    }.get(error.errno or 0, "leave the console open, it keeps trying; call the duty staff")
