"""The writer: creating, appending, recovering, locking, and what others do to its file."""

from __future__ import annotations

import errno
import os
import re
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import pytest

from engine.errors import LogError
from engine.log import Disk, Event, NightLog, Note, Recovery, read_log
from engine.log.header import header_bytes
from engine.log.lock import network_disk
from tests.engine.log_nights import (
    DUSK_MJD,
    NAME,
    FailingDisk,
    at,
    blocks_of,
    header,
    log_bytes,
    open_log,
    raising,
    read_plainly,
)


def note(n: int, text: str = "") -> Event:
    """Return a note with a number."""
    return Note(text=text or f"note {n}").stamped(n, at(n))


def files(folder: Path) -> list[str]:
    """Return the names in a folder, the note of who holds the lock apart."""
    return sorted(path.name for path in folder.iterdir() if not path.name.endswith(".held"))


def test_a_new_log_has_its_header_and_then_what_is_appended(tmp_path: Path) -> None:
    """Exactly the header and one block for each event, and nothing else in the folder."""
    log = open_log(tmp_path)
    assert log.path == tmp_path / NAME
    assert (log.events, log.findings, log.next_n) == ((), (), 1)
    assert log.path.read_bytes() == header_bytes(header())
    assert [log.append(note(n)) for n in (1, 2)] == [note(1), note(2)]
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1), note(2)])
    assert [path.name for path in tmp_path.iterdir()] == [NAME]


def test_an_append_is_one_write_then_a_sync_then_an_answer(tmp_path: Path) -> None:
    """Whatever is acknowledged was synced; header and folder are synced when it is made."""
    disk = FailingDisk()
    log = open_log(tmp_path, disk)
    assert disk.calls == ["write", "sync", "link", "sync_folder"]
    disk.calls.clear()
    log.append(note(1))
    assert disk.calls == ["write", "sync"]
    log.close()


def test_a_night_is_taken_up_where_it_was_left(tmp_path: Path) -> None:
    """The header stays as it was first written; numbers go on."""
    log = open_log(tmp_path)
    log.append(note(1))
    log.close()
    other = replace(header(), observers=("somebody else",))
    log = NightLog.open(tmp_path, other, DUSK_MJD)
    assert log.header == header()
    assert log.events == (note(1),)
    assert log.next_n == 2
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1)])


def test_a_torn_tail_is_set_aside_and_said(tmp_path: Path) -> None:
    """Copied, cut off, noted; the log is valid again, and the next opening has nothing to do."""
    whole = log_bytes([note(1)])
    torn = blocks_of([note(2)])[:-9]
    (tmp_path / NAME).write_bytes(whole + torn)
    log = open_log(tmp_path)
    aside = tmp_path / f"{NAME}.torn-{len(whole)}"
    assert aside.read_bytes() == torn
    first, recovery = log.events
    assert first == note(1)
    assert isinstance(recovery, Recovery)
    assert (recovery.n, recovery.offset) == (2, len(whole))
    assert (recovery.removed_bytes, recovery.set_aside) == (len(torn), aside.name)
    assert log.next_n == 3
    assert "torn" in log.findings[0].what
    log.append(note(603))
    log.close()
    again = open_log(tmp_path)
    again.close()
    assert [f.what for f in again.findings] == ["entry 3 to 602 is missing before this"]
    assert len(again.events) == 3
    assert read_plainly(again.path.read_bytes())


def test_each_step_of_a_recovery_is_on_disk_before_the_next(tmp_path: Path) -> None:
    """Copy, sync, name it, sync the folder; only then cut and sync; only then note it and sync."""
    (tmp_path / NAME).write_bytes(log_bytes([note(1)]) + b"\n[[no")
    disk = FailingDisk()
    open_log(tmp_path, disk).close()
    copied = ["write", "sync", "link", "sync_folder"]
    assert disk.calls == [*copied, "truncate", "sync", "write", "sync"]


def test_two_tails_torn_at_one_place_are_both_kept(tmp_path: Path) -> None:
    """The copy of an earlier recovery is never written over."""
    whole = log_bytes([note(1)])
    (tmp_path / f"{NAME}.torn-{len(whole)}").write_bytes(b"an earlier one")
    (tmp_path / NAME).write_bytes(whole + b"\n[[no")
    log = open_log(tmp_path)
    log.close()
    assert (tmp_path / f"{NAME}.torn-{len(whole)}").read_bytes() == b"an earlier one"
    assert (tmp_path / f"{NAME}.torn-{len(whole)}-1").read_bytes() == b"\n[[no"
    named = [event.set_aside for event in log.events if isinstance(event, Recovery)]
    assert named == [f"{NAME}.torn-{len(whole)}", f"{NAME}.torn-{len(whole)}-1"]


@pytest.mark.parametrize("step", ["write", "sync", "truncate", "link", "sync_folder"])
def test_a_recovery_that_is_cut_short_is_finished_the_next_time(tmp_path: Path, step: str) -> None:
    """Fail every step of it in turn, at its first, second, third call; then open once more."""
    whole = log_bytes([note(1)])
    torn = blocks_of([note(2)])[:-9]
    for count in range(3):
        folder = tmp_path / str(count)
        folder.mkdir()
        (folder / NAME).write_bytes(whole + torn)
        disk = FailingDisk()
        calls = [0]

        def fail(calls: list[int] = calls, count: int = count) -> None:
            calls[0] += 1
            if calls[0] == count + 1:
                raise OSError(errno.EIO, os.strerror(errno.EIO))

        disk.fail[step] = fail
        try:
            open_log(folder, disk).close()
        except LogError as error:
            assert str(folder / NAME) in str(error)  # noqa: PT017
        log = open_log(folder)
        log.close()
        kinds = [event.kind for event in log.events]
        assert kinds == ["note", "recovery"]
        recovery = log.events[1]
        assert isinstance(recovery, Recovery)
        assert (folder / recovery.set_aside).read_bytes() == torn
        assert read_log(log.path).findings == ()
        assert [n for n in files(folder) if n.endswith(".new")] == []


def test_damage_in_the_middle_is_never_touched(tmp_path: Path) -> None:
    """The writer goes on behind it, and the bytes stay as they are."""
    data = log_bytes([note(1), note(2), note(3)]).replace(b'"note 2"', b'"note 2')
    (tmp_path / NAME).write_bytes(data)
    log = open_log(tmp_path)
    log.append(note(4))
    log.close()
    assert log.path.read_bytes() == data + blocks_of([note(4)])
    assert [event.n for event in read_log(log.path).events] == [1, 3, 4]


def test_a_header_that_was_never_finished_is_set_aside(tmp_path: Path) -> None:
    """On disks without second names a log may have been cut short while it was made."""
    part = header_bytes(header())[:100]
    (tmp_path / NAME).write_bytes(part)
    log = open_log(tmp_path)
    log.close()
    assert (tmp_path / f"{NAME}.torn-0").read_bytes() == part
    assert [event.kind for event in log.events] == ["recovery"]
    assert log.path.read_bytes().startswith(header_bytes(header()))


def test_a_disk_without_second_names_gets_its_log_too(tmp_path: Path) -> None:
    """Memory sticks know no hard links; a log that is there is still never replaced."""
    disk = FailingDisk()
    disk.fail["link"] = raising(errno.EPERM)
    log = open_log(tmp_path, disk)
    log.append(note(1))
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1)])
    assert files(tmp_path) == [NAME]


@pytest.mark.parametrize("data", [b"my own notes\n", b"\x00" * 99])
def test_a_file_that_is_no_log_is_left_alone(tmp_path: Path, data: bytes) -> None:
    """It has the night's name, but it is somebody's: say so, change nothing."""
    (tmp_path / NAME).write_bytes(data)
    with pytest.raises(LogError, match="no night log"):
        open_log(tmp_path)
    assert (tmp_path / NAME).read_bytes() == data


def test_a_log_of_a_later_version_is_not_written_to(tmp_path: Path) -> None:
    """It is read as far as it is known, but an old writer keeps its hands off."""
    data = header_bytes(header()).replace(b"schema = 1", b"schema = 2")
    (tmp_path / NAME).write_bytes(data + blocks_of([note(1)]))
    with pytest.raises(LogError, match="this version writes 1 only"):
        open_log(tmp_path)
    assert read_log(tmp_path / NAME).events == (note(1),)


def test_a_folder_that_is_not_there_says_what_to_do(tmp_path: Path) -> None:
    """One line with the path and the remedy."""
    with pytest.raises(LogError, match="the folder must exist, be writable and have room"):
        open_log(tmp_path / "nowhere")


HOLD = """
import sys
from pathlib import Path
from tests.engine.log_nights import open_log
log = open_log(Path(sys.argv[1]))
print("open", flush=True)
sys.stdin.readline()
"""


def test_a_second_writer_is_told_who_has_the_night(tmp_path: Path) -> None:
    """Another process holds it: its number, user, computer and since when; then it dies."""
    child = subprocess.Popen(
        [sys.executable, "-c", HOLD, str(tmp_path)],
        stdin=subprocess.PIPE,
        stdout=subprocess.PIPE,
        text=True,
    )
    assert child.stdin is not None
    assert child.stdout is not None
    assert child.stdout.readline() == "open\n"
    before = (tmp_path / NAME).read_bytes()
    told = rf"open already, by \S+ on \S+, process {child.pid}, since 2027-03-14T19:00:00Z; close"
    with pytest.raises(LogError, match=told):
        open_log(tmp_path)
    assert (tmp_path / NAME).read_bytes() == before
    child.kill()
    child.wait()
    child.stdin.close()
    child.stdout.close()
    assert [p.name for p in tmp_path.iterdir() if p.name.endswith(".held")] == [f".{NAME}.held"]
    log = open_log(tmp_path)
    assert f"process {os.getpid()}" in (tmp_path / f".{NAME}.held").read_text()
    log.close()
    assert [path.name for path in tmp_path.iterdir()] == [NAME]


def test_a_second_writer_in_the_same_process_is_refused(tmp_path: Path) -> None:
    """The lock belongs to the open file, not to the process."""
    log = open_log(tmp_path)
    with pytest.raises(LogError, match="open already"):
        open_log(tmp_path)
    log.close()
    open_log(tmp_path).close()


def test_the_temporary_disk_of_the_tests_is_a_local_one(tmp_path: Path) -> None:
    """The table of mounts is read, and says nothing of a local disk."""
    assert network_disk(tmp_path) is None
    log = open_log(tmp_path)
    assert log.findings == ()
    log.close()


def test_a_disk_without_second_names_may_fail_and_lose_files_like_any_other(tmp_path: Path) -> None:
    """A fresh file takes over there too, and what it takes over from stays beside it."""
    disk = FailingDisk()
    disk.fail["link"] = raising(errno.EPERM)
    log = open_log(tmp_path, disk)
    log.append(note(1))
    disk.fail["sync"] = raising(errno.EIO, times=1)
    with pytest.raises(OSError, match="errno 5"):
        log.append(note(2))
    log.append(note(2))
    assert log.path.read_bytes() == log_bytes([note(1), note(2)])
    failed = f"{NAME}.failed-{len(log_bytes([note(1)]))}"
    assert (tmp_path / failed).read_bytes() == log_bytes([note(1)])
    log.path.unlink()
    log.append(note(3))
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1), note(2), note(3)])
    assert files(tmp_path) == [NAME, failed]


# What others do to the file while it is open


def test_a_log_that_was_removed_is_written_anew(tmp_path: Path) -> None:
    """Writes to a removed file succeed and are worth nothing: noticed before they are answered."""
    log = open_log(tmp_path)
    log.append(note(1))
    log.path.unlink()
    log.append(note(2))
    assert log.path.read_bytes() == log_bytes([note(1), note(2)])
    with pytest.raises(LogError, match="open already"):
        open_log(tmp_path)
    log.close()


def test_a_log_removed_between_write_and_answer_is_not_acknowledged(tmp_path: Path) -> None:
    """The file goes away while an entry is being written: it fails, and the retry writes it."""

    class Removing(Disk):
        def sync(self, fd: int) -> None:
            super().sync(fd)
            (tmp_path / NAME).unlink(missing_ok=True)

    log = open_log(tmp_path)
    log._disk = Removing()
    with pytest.raises(OSError, match="not in its place"):
        log.append(note(1))
    log._disk = Disk()
    log.append(note(1))
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1)])


def test_a_folder_that_was_removed_and_put_back(tmp_path: Path) -> None:
    """Nothing can be written meanwhile; afterwards the whole log is there."""
    folder = tmp_path / "nights"
    folder.mkdir()
    log = open_log(folder)
    log.append(note(1))
    moved = folder.rename(tmp_path / "elsewhere")
    with pytest.raises(OSError) as failed:  # noqa: PT011  (the number is asserted below)
        log.append(note(2))
    assert failed.value.errno == errno.ENOENT
    folder.mkdir()
    log.append(note(2))
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1), note(2)])
    assert read_log(moved / NAME).events == (note(1),)


@pytest.mark.parametrize(
    "size", [0, 50, len(log_bytes([])), len(log_bytes([note(1)])), len(log_bytes([note(1)])) + 9]
)
def test_a_log_that_was_cut_down_is_written_anew(tmp_path: Path, size: int) -> None:
    """Somebody cut it: the acknowledged night comes back, what they left stays beside it."""
    log = open_log(tmp_path)
    log.append(note(1))
    log.append(note(2))
    whole = log.path.read_bytes()
    os.truncate(log.path, size)
    log.append(note(3))
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1), note(2), note(3)])
    assert (tmp_path / f"{NAME}.failed-{len(whole)}").read_bytes() == whole[:size]


def test_what_others_append_is_kept(tmp_path: Path) -> None:
    """A remark, without even an end of line: the next entry stands on a line of its own."""
    log = open_log(tmp_path)
    log.append(note(1))
    with log.path.open("ab") as file:
        file.write(b"# a remark")
    log.append(note(2))
    log.close()
    data = log.path.read_bytes()
    assert data == log_bytes([note(1)]) + b"# a remark\n" + blocks_of([note(2)])
    assert read_log(log.path).events == (note(1), note(2))
    assert "changed by another program" in log.findings[-1].what


@pytest.mark.parametrize("by_rename", [False, True])
def test_what_others_edit_is_kept_and_so_is_what_it_was(tmp_path: Path, by_rename: bool) -> None:
    """An editor saves in place or under a new file: the edit stands, the log as it was is kept."""
    log = open_log(tmp_path)
    log.append(note(1, "a tpyo"))
    before = log.path.read_bytes()
    edited = before.replace(b"a tpyo", b"a typo, put right")
    if by_rename:
        (tmp_path / "fresh").write_bytes(edited)
        (tmp_path / "fresh").rename(log.path)
    else:
        log.path.write_bytes(edited)
    log.append(note(2))
    assert log.path.read_bytes() == edited + blocks_of([note(2)])
    assert (tmp_path / f"{NAME}.before-{len(before)}").read_bytes() == before
    with pytest.raises(LogError, match="open already"):
        open_log(tmp_path)
    log.close()
    assert [event.n for event in read_log(log.path).events] == [1, 2]


def test_another_file_in_the_logs_place_gives_way_and_is_kept(tmp_path: Path) -> None:
    """It is no log: it goes on under another name, the night under its own."""
    log = open_log(tmp_path)
    log.append(note(1))
    whole = log.path.read_bytes()
    (tmp_path / "other").write_bytes(b"a shopping list\n")
    (tmp_path / "other").rename(log.path)
    log.append(note(2))
    log.close()
    assert log.path.read_bytes() == log_bytes([note(1), note(2)])
    assert (tmp_path / f"{NAME}.failed-{len(whole)}").read_bytes() == b"a shopping list\n"


def test_the_error_names_the_file(tmp_path: Path) -> None:
    """Every LogError begins with the path it is about."""
    (tmp_path / NAME).write_bytes(b"x")
    with pytest.raises(LogError, match=rf"^{re.escape(str(tmp_path / NAME))}:"):
        open_log(tmp_path)
