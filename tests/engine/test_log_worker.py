"""The worker: numbers at once, disk when it can, trouble said, nothing forgotten or silent."""

from __future__ import annotations

import errno
import math
import os
import threading
import time
from pathlib import Path
from typing import Any

import pytest

from engine.clock import HandClock
from engine.log import Conditions, Disk, Event, LogWorker, NightLog, Note, read_log
from tests.engine.log_nights import (
    NAME,
    FailingDisk,
    at,
    log_bytes,
    open_log,
    raising,
    read_plainly,
)

PATIENCE_S = 10.0


class Heard:
    """What a worker said: events written, troubles and their ends; waits for either."""

    def __init__(self) -> None:
        self.written: list[int] = []
        self.troubles: list[str | None] = []
        self._news = threading.Condition()

    def on_written(self, event: Event) -> None:
        """Remember an event that is on disk."""
        with self._news:
            self.written.append(event.n)
            self._news.notify_all()

    def on_trouble(self, text: str | None) -> None:
        """Remember a trouble, or its end."""
        with self._news:
            self.troubles.append(text)
            self._news.notify_all()

    def wait_for_trouble(self, count: int = 1) -> None:
        """Wait until so many troubles (or ends of one) were said."""
        with self._news:
            assert self._news.wait_for(lambda: len(self.troubles) >= count, PATIENCE_S)


def worker_on(log: NightLog, heard: Heard, **other: Any) -> LogWorker:
    """Return a worker that retries quickly."""
    said: dict[str, Any] = {"on_written": heard.on_written, "on_trouble": heard.on_trouble}
    return LogWorker(log, HandClock(at(600)), retry_s=0.01, **said | other)


def test_events_are_numbered_at_once_and_written_in_order(tmp_path: Path) -> None:
    """What `submit` returns is exactly what a reader of the file finds."""
    heard = Heard()
    worker = worker_on(open_log(tmp_path), heard)
    handed = [worker.submit(Note(text=f"{count}")) for count in range(50)]
    assert [event.n for event in handed] == list(range(1, 51))
    assert handed[0].t_mjd == at(600)
    assert worker.close()
    assert heard.written == list(range(1, 51))
    assert heard.troubles == []
    assert list(read_log(tmp_path / NAME).events) == handed


def test_submitting_never_waits_for_the_disk(tmp_path: Path) -> None:
    """A disk that takes a second for a write holds up nobody."""
    go_on = threading.Event()

    class Slow(Disk):
        def sync(self, fd: int) -> None:
            assert go_on.wait(PATIENCE_S)
            super().sync(fd)

    log = open_log(tmp_path)
    log._disk = Slow()
    worker = worker_on(log, Heard())
    begin = time.perf_counter()
    for count in range(20):
        worker.submit(Note(text=f"{count}"))
    assert time.perf_counter() - begin < 1.0
    assert worker.unwritten == 20
    assert not worker.drain(0.05)
    go_on.set()
    assert worker.drain(PATIENCE_S)
    assert worker.unwritten == 0
    assert worker.close()


def test_what_can_not_be_written_is_refused_and_uses_up_no_number(tmp_path: Path) -> None:
    """The caller hears of it; the log goes on."""
    worker = worker_on(open_log(tmp_path), Heard())
    with pytest.raises(ValueError, match="finite"):
        worker.submit(Conditions(seeing_arcsec=math.nan))
    assert worker.submit(Note(text="x")).n == 1
    assert worker.close()
    with pytest.raises(RuntimeError, match="closed"):
        worker.submit(Note(text="too late"))


@pytest.mark.parametrize(
    ("number", "step", "what"),
    [
        (errno.ENOSPC, "write", "make room"),
        (errno.EDQUOT, "write", "make room"),
        (errno.EROFS, "write", "read-only"),
        (errno.EACCES, "write", "permissions"),
        (errno.EIO, "write", "the disk fails"),
        (errno.EIO, "sync", "the disk fails"),
        (errno.ENOSPC, "sync", "make room"),
        (errno.EBUSY, "write", "the console keeps trying"),
    ],
)
def test_a_failing_disk_is_said_and_retried_until_it_works(
    tmp_path: Path, number: int, step: str, what: str
) -> None:
    """Nothing is lost, doubled or out of turn; the trouble is said once, and so is its end."""
    disk = FailingDisk()
    heard = Heard()
    log = open_log(tmp_path, disk)
    worker = worker_on(log, heard)
    handed = [worker.submit(Note(text="before"))]
    assert worker.drain(PATIENCE_S)
    disk.fail[step] = raising(number)
    handed += [worker.submit(Note(text=f"{count}")) for count in range(5)]
    heard.wait_for_trouble()
    assert worker.unwritten == 5
    assert worker.trouble is not None
    assert what in worker.trouble
    assert read_log(tmp_path / NAME).events == (handed[0],)
    disk.fail.clear()
    assert worker.drain(PATIENCE_S)
    heard.wait_for_trouble(2)
    assert heard.troubles[1:] == [None]
    assert worker.trouble is None
    assert worker.close()
    assert heard.written == [1, 2, 3, 4, 5, 6]
    assert (tmp_path / NAME).read_bytes() == log_bytes(handed)


def test_after_a_failed_sync_the_log_goes_on_in_a_fresh_file(tmp_path: Path) -> None:
    """The old file stays beside it under another name; its sync is never tried again."""
    disk = FailingDisk()
    log = open_log(tmp_path, disk)
    before = log.path.stat().st_ino
    worker = worker_on(log, Heard())
    handed = [worker.submit(Note(text="before"))]
    assert worker.drain(PATIENCE_S)
    end = log.path.stat().st_size
    disk.fail["sync"] = raising(errno.EIO, times=1)
    handed.append(worker.submit(Note(text="after")))
    assert worker.close()
    assert (tmp_path / NAME).read_bytes() == log_bytes(handed)
    assert (tmp_path / NAME).stat().st_ino != before
    assert (tmp_path / f"{NAME}.failed-{end}").stat().st_ino == before
    assert len(read_plainly((tmp_path / NAME).read_bytes())) == 2


def test_a_short_write_that_can_not_be_cut_off_at_once_is_cut_off_later(tmp_path: Path) -> None:
    """Half an entry went in, and then neither the rest nor the truncation worked."""
    disk = FailingDisk()
    log = open_log(tmp_path, disk)
    heard = Heard()
    worker = worker_on(log, heard)
    handed = [worker.submit(Note(text="before"))]
    assert worker.drain(PATIENCE_S)
    whole = log.path.read_bytes()
    writes = [0]

    def second_write_fails() -> None:
        writes[0] += 1
        if writes[0] % 2 == 0:
            raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC))

    disk.fail = {
        "write": second_write_fails,
        "short": lambda: None,
        "truncate": raising(errno.EIO),
    }
    handed.append(worker.submit(Note(text="after")))
    heard.wait_for_trouble()
    spoiled = log.path.read_bytes()
    assert len(spoiled) > len(whole)
    assert read_log(log.path).events == (handed[0],)
    disk.fail.clear()
    assert worker.close()
    assert (tmp_path / NAME).read_bytes() == log_bytes(handed)


def test_a_defect_is_said_and_does_not_end_the_worker(tmp_path: Path) -> None:
    """Whatever is raised while writing is heard of, and the entry is tried again."""
    disk = FailingDisk()
    heard = Heard()
    worker = worker_on(open_log(tmp_path, disk), heard)
    left = [1]

    def defect() -> None:
        if left[0]:
            left[0] -= 1
            raise ZeroDivisionError("a defect")

    disk.fail["sync"] = defect
    worker.submit(Note(text="x"))
    assert worker.close()
    assert heard.troubles[0] == (
        "the log can't be written: ZeroDivisionError('a defect'); the console keeps trying"
    )
    assert heard.troubles[1] is None
    assert len(read_plainly((tmp_path / NAME).read_bytes())) == 1


def test_a_listener_that_fails_does_not_end_the_worker(tmp_path: Path) -> None:
    """The entry counts as written, the failure is said, the next entry is written."""
    heard = Heard()

    def on_written(event: Event) -> None:
        heard.on_written(event)
        if event.n == 1:
            raise ValueError("no such widget")

    worker = worker_on(open_log(tmp_path), heard, on_written=on_written)
    worker.submit(Note(text="1"))
    heard.wait_for_trouble()
    assert worker.trouble is not None
    assert "no such widget" in worker.trouble
    worker.submit(Note(text="2"))
    assert worker.close()
    assert heard.written == [1, 2]

    def on_trouble(text: str | None) -> None:
        raise ValueError("no such panel")

    disk = FailingDisk()
    worker = worker_on(open_log(tmp_path, disk), heard, on_trouble=on_trouble)
    disk.fail["write"] = raising(errno.ENOSPC, times=2)
    worker.submit(Note(text="3"))
    assert worker.close()
    assert len(read_plainly((tmp_path / NAME).read_bytes())) == 3


def test_a_night_on_a_dead_disk_can_be_rescued(tmp_path: Path) -> None:
    """The disk stays full: closing says so, and the whole night is written elsewhere first."""
    nights, elsewhere = tmp_path / "nights", tmp_path / "elsewhere"
    nights.mkdir()
    elsewhere.mkdir()
    disk = FailingDisk()
    heard = Heard()
    worker = worker_on(open_log(nights, disk), heard)
    handed = [worker.submit(Note(text="before"))]
    assert worker.drain(PATIENCE_S)
    disk.fail["write"] = raising(errno.ENOSPC)
    handed += [worker.submit(Note(text=f"{count}")) for count in range(3)]
    heard.wait_for_trouble()
    saved = worker.rescue(elsewhere)
    assert saved == elsewhere / f"{NAME}.rescued"
    assert saved.read_bytes() == log_bytes(handed)
    assert not worker.close(timeout_s=0.1)
    assert worker.unwritten == 3
    assert read_log(nights / NAME).events == (handed[0],)
    open_log(nights).close()


def test_a_write_that_never_returns_keeps_the_file_open(tmp_path: Path) -> None:
    """The file is not closed under the write; what was asked in time is answered in time."""
    go_on = threading.Event()

    class Stuck(Disk):
        def sync(self, fd: int) -> None:
            assert go_on.wait(PATIENCE_S)
            super().sync(fd)

    log = open_log(tmp_path)
    log._disk = Stuck()
    worker = worker_on(log, Heard())
    worker.submit(Note(text="x"))
    begin = time.perf_counter()
    assert not worker.close(timeout_s=0.1)
    assert time.perf_counter() - begin < 2.0
    go_on.set()
    assert worker.drain(PATIENCE_S)
    log.close()
