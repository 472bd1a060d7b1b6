"""Appends on a thread of their own, so that a slow or failing disk never holds up the night."""

from __future__ import annotations

import threading
from collections import deque
from collections.abc import Callable
from pathlib import Path

from engine.clock import Clock
from engine.log.disk import Disk, remedy
from engine.log.events import Event
from engine.log.recovery import keep_beside
from engine.log.writer import NightLog, encoded

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
        *,
        retry_s: float = RETRY_S,
    ) -> None:
        self._log = log
        self._clock = clock
        self._on_written = on_written
        self._on_trouble = on_trouble
        self._retry_s = retry_s
        self._waiting: deque[tuple[Event, bytes]] = deque()
        self._change = threading.Condition()
        self._next_n = log.next_n
        self._is_closing = False
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
        is handed over then, and no number is used up. RuntimeError once the worker is closed.
        """
        with self._change:
            if self._is_closing:
                raise RuntimeError("the log is closed")
            as_it_stands, block = encoded(event.stamped(self._next_n, self._clock.now_mjd()))
            self._next_n += 1
            self._waiting.append((as_it_stands, block))
            self._change.notify_all()
        return as_it_stands

    def drain(self, timeout_s: float) -> bool:
        """Wait until everything is on disk; return whether it is."""
        with self._change:
            return self._change.wait_for(lambda: not self._waiting, timeout_s)

    def close(self, timeout_s: float = 10.0) -> bool:
        """Write what can be written in a time, then let the log go; return whether all was.

        A disk that holds up a write for ever keeps the log's file open: it is never closed under
        a write, and the lock goes with the process.
        """
        done = self.drain(timeout_s)
        with self._change:
            self._is_closing = True
            self._change.notify_all()
        self._thread.join(timeout_s)
        if not self._thread.is_alive():
            self._log.close()
        return done and not self._waiting

    def rescue(self, folder: Path) -> Path:
        """Write the whole log, what the disk refuses included, into another folder.

        For the end of a night whose disk stays full or dead. Return the file, named like the log
        with ``.rescued``; it is a night log as any other once it has the log's name. OSError when
        it can't be written there either.
        """
        with self._change:
            data = self._log.rescued() + b"".join(block for _, block in self._waiting)
        return keep_beside(folder / self._log.path.name, "rescued", data, Disk())

    def _work(self) -> None:
        while (waiting := self._next()) is not None:
            event, block = waiting
            try:
                self._log.append_block(block)
            except OSError as error:
                self._tell(f"the log can't be written: {remedy(error)}")
            except Exception as error:  # noqa: BLE001  (this thread must not end unheard)
                self._tell(f"the log can't be written: {error!r}; the console keeps trying")
            else:
                self._written(event)
                continue
            with self._change:
                self._change.wait_for(lambda: self._is_closing, self._retry_s)

    def _next(self) -> tuple[Event, bytes] | None:
        """Return the next event to write, once there is one; None when the worker is to end."""
        with self._change:
            self._change.wait_for(lambda: self._waiting or self._is_closing)
            return None if self._is_closing else self._waiting[0]

    def _written(self, event: Event) -> None:
        """Say that an event is on disk."""
        with self._change:
            self._waiting.popleft()
            self._change.notify_all()
        self._tell(None)
        try:
            self._on_written(event)
        except Exception as error:  # noqa: BLE001  (as above: the next event must be written)
            self._tell(f"the log is written, but what follows it failed: {error!r}")

    def _tell(self, trouble: str | None) -> None:
        if trouble == self.trouble:
            return
        self.trouble = trouble
        try:
            self._on_trouble(trouble)
        except Exception as error:  # noqa: BLE001  (as above; the text still says it)
            self.trouble = f"{trouble or 'the log is written'}, which could not be shown: {error!r}"
