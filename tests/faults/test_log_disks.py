"""Disks that are full, read-only or fail at random; consoles that race for one night."""

from __future__ import annotations

import os
import subprocess
import sys
import time
from pathlib import Path

import pytest

from engine.clock import HandClock
from engine.errors import LogError
from engine.log import LogWorker, Note, read_log
from tests.engine.log_nights import NAME, at, log_bytes, open_log, read_plainly
from tests.faults.log_disks import fail_at_random, fill_disk, in_a_child, small_disk
from tests.faults.log_faults import PATIENCE_S, follow_through_tears

NO_MOUNT = "this user may not mount a memory disk"


def test_a_file_size_limit_is_a_full_disk(tmp_path: Path) -> None:
    """The kernel cuts a write short in the middle of an entry; nothing of it stays behind."""
    tally = in_a_child("reach_size_limit", tmp_path)
    assert tally.tried == 6
    assert (tally.lost, tally.invented) == (0, 0)


def test_a_disk_that_is_really_full(tmp_path: Path) -> None:
    """A memory disk of 256 kB, filled up and emptied five times while the night goes on."""
    with small_disk(tmp_path / "disk", "256k") as disk:
        if disk is None:
            pytest.skip(NO_MOUNT)
        tally = fill_disk(disk)
    assert tally.tried == 6
    assert (tally.lost, tally.invented) == (0, 0)


def test_a_night_can_not_be_opened_on_a_full_disk_but_says_why(tmp_path: Path) -> None:
    """No room even for the header: nothing half-made is left."""
    with small_disk(tmp_path / "disk", "64k") as disk:
        if disk is None:
            pytest.skip(NO_MOUNT)
        (disk / "ballast").write_bytes(bytes(64 * 1024))
        with pytest.raises(LogError, match=r"No space left.*have room"):
            open_log(disk)
        assert [path.name for path in disk.iterdir()] == ["ballast"]


def remount(disk: Path, how: str) -> None:
    """Make a mounted disk read-only (``ro``) or writable (``rw``)."""
    subprocess.run(["mount", "-o", f"remount,{how}", str(disk)], check=True)


def test_a_disk_that_is_really_read_only(tmp_path: Path) -> None:
    """It can't be opened for writing and is said to be so; it can be read.

    The kernel lets nobody make a disk read-only while a file on it is open for writing, so a disk
    that becomes so under a night is one of the failing disks of the worker's tests.
    """
    with small_disk(tmp_path / "disk", "256k") as disk:
        if disk is None:
            pytest.skip(NO_MOUNT)
        log = open_log(disk)
        log.append(Note(text="before").stamped(1, at(600)))
        log.close()
        remount(disk, "ro")
        with pytest.raises(LogError, match="Read-only"):
            open_log(disk)
        assert len(read_log(disk / NAME).events) == 1
        remount(disk, "rw")


def test_an_open_night_waits_until_its_place_is_free_again(tmp_path: Path) -> None:
    """Its file is moved away and a folder put there: nothing can be written, nothing is lost."""
    worker = LogWorker(open_log(tmp_path), HandClock(at(600)), retry_s=0.01)
    path = tmp_path / NAME
    handed = [worker.submit(Note(text="before"))]
    assert worker.drain(PATIENCE_S)
    path.rename(tmp_path / "moved")
    path.mkdir()
    handed.append(worker.submit(Note(text="after")))
    until = time.monotonic() + PATIENCE_S
    while worker.trouble is None and time.monotonic() < until:
        time.sleep(0.01)
    assert worker.trouble is not None
    assert worker.unwritten == 1
    path.rmdir()
    assert worker.close()
    assert path.read_bytes() == log_bytes(handed)


def test_any_call_may_fail_at_any_time(tmp_path: Path) -> None:
    """A third of all calls fail, before or after they took effect: nothing acknowledged is lost."""
    tally = fail_at_random(12, tmp_path, seed=7)
    assert tally.tried > 400
    assert tally.acknowledged > 5000
    assert (tally.lost, tally.invented) == (0, 0)


def test_a_follower_through_three_hundred_tears(tmp_path: Path) -> None:
    """Writers torn off in the middle of entries, again and again: it sees what is whole, only."""
    tally = follow_through_tears(300, tmp_path, seed=11)
    assert tally.tried > 300
    assert tally.acknowledged > 3000
    assert (tally.lost, tally.invented) == (0, 0)


RACE = """
import sys, time
from pathlib import Path
from engine.errors import LogError
from engine.log import Note
from tests.engine.log_nights import at, open_log
print("ready", flush=True)
sys.stdin.readline()
try:
    log = open_log(Path(sys.argv[1]))
except LogError as error:
    print("refused" if "open already" in str(error) else str(error), flush=True)
    sys.exit()
log.append(Note(text=sys.argv[2]).stamped(log.next_n, at(600)))
print("had it", flush=True)
sys.stdin.readline()
"""


def test_of_consoles_that_race_for_a_night_one_has_it(tmp_path: Path) -> None:
    """Four processes open a night that is not there yet, at one moment, several times."""
    racers = [
        subprocess.Popen(
            [sys.executable, "-c", RACE, str(tmp_path), str(number)],
            stdin=subprocess.PIPE,
            stdout=subprocess.PIPE,
            text=True,
        )
        for number in range(4)
    ]
    try:
        said = _at_one_moment(racers)
    finally:
        for racer in racers:
            racer.communicate("\n", timeout=PATIENCE_S)
    assert sorted(said) == ["had it", "refused", "refused", "refused"]
    assert len(read_plainly((tmp_path / NAME).read_bytes())) == 1
    assert [name for name in os.listdir(tmp_path) if name.endswith(".new")] == []


def _at_one_moment(racers: list[subprocess.Popen[str]]) -> list[str]:
    for racer in racers:
        assert racer.stdout is not None
        assert racer.stdout.readline() == "ready\n"
    for racer in racers:
        assert racer.stdin is not None
        racer.stdin.write("\n")
        racer.stdin.flush()
    return [racer.stdout.readline().strip() for racer in racers if racer.stdout is not None]
