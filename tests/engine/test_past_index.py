"""The index of past nights says what a fold over all logs says, whatever happened to either."""

from __future__ import annotations

import os
import shutil
import sqlite3
import subprocess
import sys
import tempfile
from collections.abc import Iterator, Sequence
from concurrent.futures.process import BrokenProcessPool
from datetime import date
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from engine.log import Exposure, Note
from engine.past import PastIndex, index_path
from engine.past.build import Read, read_one
from engine.past.carry import carried, done_before_by_folding
from engine.past.exposures import totals
from engine.past.nights import nights
from engine.past.search import find_words
from engine.past.seeing import measurements
from tests.engine.log_nights import TEXTS, blocks_of
from tests.engine.past_logs import (
    folded,
    rows_by_fold,
    rows_by_index,
    small_archive,
    totals_by_fold,
)

NEVER = date(1999, 1, 1)


def agrees(index: PastIndex, folder: Path) -> None:
    """Assert that the index answers as the fold over all logs does."""
    rows = rows_by_fold(folder)
    assert rows_by_index(index) == rows
    told = totals(index)
    by_fold = totals_by_fold(folder)
    key = ("target", "programme", "filter", "seconds", "outcome")
    assert {tuple(getattr(t, k) for k in key): (t.count, t.nights) for t in told} == by_fold
    names = {row[2] for row in rows}
    assert sorted(carried(index, NEVER, names), key=str) == sorted(
        done_before_by_folding(folder, NEVER, names), key=str
    )
    for name in names:
        assert carried(index, NEVER, {name}) == done_before_by_folding(folder, NEVER, {name})
    states = folded(folder)
    seen = [each.zenith_arcsec for state in states.values() for each in state.seeing]
    assert list(measurements(index).zenith_arcsec) == [x for x in seen if x > 0.0]
    noted = index.ask("SELECT text FROM words WHERE kind = 'note' ORDER BY text")
    assert [text for (text,) in noted] == sorted(
        note.text for state in states.values() for note in state.notes
    )
    lines = nights(index)
    assert [line.name for line in lines if line.is_used] == list(states)
    for line in lines:
        if line.is_used:
            assert line.kept == len(states[line.name].kept)


def change(path: Path, what: str, at: float, text: str) -> None:
    """Do something to a log, as people, disks and other programs do."""
    data = path.read_bytes()
    place = int(at * len(data))
    match what:
        case "flip":
            flipped = bytes([data[place] ^ 1]) if place < len(data) else b""
            path.write_bytes(data[:place] + flipped + data[place + 1 :])
        case "cut":
            path.write_bytes(data[:place])
        case "append":
            note = Note(n=9000 + len(data), t_mjd=61474.5, text=text, target="AR 0001")
            path.write_bytes(data + blocks_of([note]))
        case "append exposure":
            taken = Exposure(
                n=9000 + len(data), t_mjd=61474.5, of=1, target=text, filter="V", seconds=60.0,
                exposed_s=60.0, start_mjd=61474.4, mid_mjd=61474.45, end_mjd=61474.5,
                outcome="good", credit=at, why=text,
            )  # fmt: skip
            path.write_bytes(data + blocks_of([taken]))
        case "delete":
            path.unlink()
        case "rename":
            path.rename(path.with_name("2031-01-01.toml"))
        case "foreign":
            path.write_bytes(b"[[something]]\nelse = 1\n")
        case _:
            path.write_bytes(text.encode("utf-8", "replace"))


CHANGES = ("flip", "cut", "append", "append exposure", "delete", "rename", "foreign", "text")


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.too_slow])
@given(
    st.lists(
        st.tuples(st.integers(0, 7), st.sampled_from(CHANGES), st.floats(0.0, 1.0), TEXTS),
        min_size=1,
        max_size=5,
    )
)
def test_it_is_the_fold_whatever_happens_to_logs(
    changes: list[tuple[int, str, float, str]],
) -> None:
    """Edits, cuts, appends, deletions, renames: opened anew, or refreshed, it says the same."""
    with tempfile.TemporaryDirectory() as name:
        folder, cache = Path(name, "nights"), Path(name, "cache")
        paths = small_archive(folder)
        with PastIndex(folder, cache=cache) as kept:
            agrees(kept, folder)
            for place, what, at, text in changes:
                if paths[place].exists():
                    change(paths[place], what, at, text)
            kept.refresh()
            agrees(kept, folder)
        with PastIndex(folder, cache=cache) as index:
            assert not index.refresh()
            agrees(index, folder)


def test_a_change_that_leaves_size_and_time_alone_is_seen_while_the_file_is_young(
    tmp_path: Path,
) -> None:
    """A log that was read just after it was written is told by its content the next time."""
    paths = small_archive(tmp_path / "nights")
    path = paths[0]
    os.utime(path)
    before = path.stat()
    PastIndex(tmp_path / "nights", cache=tmp_path).close()
    data = path.read_bytes()
    path.write_bytes(data.replace(b'outcome = "good"', b'outcome = "evil"'))
    os.utime(path, ns=(before.st_atime_ns, before.st_mtime_ns))
    assert path.stat().st_size == before.st_size
    assert path.read_bytes() != data
    with PastIndex(tmp_path / "nights", cache=tmp_path) as index:
        agrees(index, tmp_path / "nights")


def test_what_did_not_change_is_not_read_again(tmp_path: Path) -> None:
    """Of eight logs one has grown: one is read. One that was only touched is read for nothing."""
    paths = small_archive(tmp_path / "nights")
    counted: list[tuple[int, int]] = []
    PastIndex(tmp_path / "nights", cache=tmp_path).close()
    change(paths[3], "append", 0.0, "wind")
    paths[5].touch()

    def note(done: int, of: int) -> None:
        counted.append((done, of))

    with PastIndex(tmp_path / "nights", cache=tmp_path, progress=note) as index:
        assert counted == [(0, 1), (1, 1)]
        agrees(index, tmp_path / "nights")


@pytest.mark.parametrize("place", [0.0, 0.02, 0.3, 0.6, 0.95])
def test_a_damaged_database_is_made_anew(tmp_path: Path, place: float) -> None:
    """Overwritten anywhere, or no database at all: the answers are those of the logs."""
    folder = tmp_path / "nights"
    small_archive(folder)
    PastIndex(folder, cache=tmp_path).close()
    path = index_path(folder, tmp_path)
    data = bytearray(path.read_bytes())
    begin = int(place * len(data))
    data[begin : begin + 30000] = b"\xa5" * len(data[begin : begin + 30000])
    path.write_bytes(data)
    with PastIndex(folder, cache=tmp_path) as index:
        agrees(index, folder)
        assert index.note is None


def test_an_index_of_another_version_or_logbook_is_made_anew(tmp_path: Path) -> None:
    """Version and folder stand in it, and are looked at."""
    folder = tmp_path / "nights"
    small_archive(folder)
    PastIndex(folder, cache=tmp_path).close()
    path = index_path(folder, tmp_path)
    for change_it in ("PRAGMA user_version = 99", "UPDATE meta SET value = '/else'"):
        db = sqlite3.connect(path)
        db.execute(change_it)
        db.execute("DELETE FROM exposure")
        db.commit()
        db.close()
        with PastIndex(folder, cache=tmp_path) as index:
            agrees(index, folder)


def test_it_can_be_made_afresh(tmp_path: Path) -> None:
    """What was changed in it without a trace is wrong until somebody asks for a new one."""
    folder = tmp_path / "nights"
    small_archive(folder)
    PastIndex(folder, cache=tmp_path).close()
    db = sqlite3.connect(index_path(folder, tmp_path))
    db.execute("UPDATE exposure SET outcome = 'rejected'")
    db.commit()
    db.close()
    with PastIndex(folder, cache=tmp_path, afresh=True) as index:
        agrees(index, folder)


def test_a_build_that_was_cut_short_is_finished_by_the_next(tmp_path: Path) -> None:
    """Logs that went in without their totals get them."""
    folder = tmp_path / "nights"
    small_archive(folder)
    PastIndex(folder, cache=tmp_path).close()
    db = sqlite3.connect(index_path(folder, tmp_path))
    db.execute("DELETE FROM total")
    db.execute("INSERT INTO meta VALUES ('unsummed', 'yes')")
    db.commit()
    db.close()
    with PastIndex(folder, cache=tmp_path) as index:
        agrees(index, folder)


def test_where_nothing_can_be_kept_it_answers_all_the_same(tmp_path: Path) -> None:
    """A cache that is no folder: made in memory, and said in a sentence."""
    folder = tmp_path / "nights"
    small_archive(folder)
    (tmp_path / "cache").write_text("a file, not a folder")
    with PastIndex(folder, cache=tmp_path / "cache") as index:
        agrees(index, folder)
        assert index.note is not None
        assert "is not kept" in index.note


def test_few_nights_leave_no_file_behind(tmp_path: Path) -> None:
    """A handful of logs is read each time; a demo leaves nothing in anybody's cache."""
    folder = tmp_path / "nights"
    small_archive(folder, nights=3)
    with PastIndex(folder, cache=tmp_path / "cache") as index:
        agrees(index, folder)
        assert index.note is None
    assert not (tmp_path / "cache").exists()


def test_forgotten_indexes_of_logbooks_that_are_gone_are_swept_up(tmp_path: Path) -> None:
    """Gone and long unchanged: removed. Still there, or only just gone: kept."""
    old, new, kept = (tmp_path / name for name in ("old", "new", "kept"))
    for folder in (old, new, kept):
        small_archive(folder)
        PastIndex(folder, cache=tmp_path).close()
    long_ago = 1_600_000_000
    for folder in (old, kept):
        os.utime(index_path(folder, tmp_path), (long_ago, long_ago))
    shutil.rmtree(old)
    shutil.rmtree(new)
    last = tmp_path / "last"
    small_archive(last)
    PastIndex(last, cache=tmp_path).close()
    there = [index_path(folder, tmp_path).exists() for folder in (old, new, kept, last)]
    assert there == [False, True, True, True]


def test_without_full_text_search_the_index_is_made_all_the_same(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """An SQLite that lacks it: words are found by their letters."""
    monkeypatch.setattr("engine.past.schema.FULL_TEXT", "CREATE VIRTUAL TABLE x USING nothing ()")
    folder = tmp_path / "nights"
    path = small_archive(folder)[2]
    change(path, "append", 0.0, "a halo round the Moon")
    with PastIndex(folder, cache=tmp_path) as index:
        assert not index.has_full_text
        agrees(index, folder)
        assert [each.night for each in find_words(index, "halo round")] == [path.stem]


def test_when_helping_processes_die_the_rest_is_read_all_the_same(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Killed after three logs, by the system or by anyone: no log is missing, none is twice."""

    def three_then_dead(paths: Sequence[Path]) -> Iterator[Read]:
        yield from map(read_one, paths[:3])
        raise BrokenProcessPool

    folder = tmp_path / "nights"
    small_archive(folder)
    monkeypatch.setattr("engine.past.build.MANY", 5)
    monkeypatch.setattr("engine.past.build._read_by_all_cores", three_then_dead)
    with PastIndex(folder, cache=tmp_path) as index:
        agrees(index, folder)


SECOND = """
import sys
from pathlib import Path
from engine.past import PastIndex
for _ in range(6):
    with PastIndex(Path(sys.argv[1]), cache=Path(sys.argv[2])) as index:
        print(index.note, index.ask("SELECT count(*) FROM exposure")[0][0])
"""


def test_two_processes_build_and_ask_at_once(tmp_path: Path) -> None:
    """Neither is refused, none falls back to memory, and both count the same."""
    folder = tmp_path / "nights"
    small_archive(folder, nights=30)
    words = [sys.executable, "-c", SECOND, str(folder), str(tmp_path / "cache")]
    others = [subprocess.Popen(words, stdout=subprocess.PIPE, text=True) for _ in range(2)]
    told = [each.communicate(timeout=60)[0] for each in others]
    count = len(rows_by_fold(folder))
    assert told == [f"None {count}\n" * 6] * 2
    with PastIndex(folder, cache=tmp_path / "cache") as index:
        agrees(index, folder)


def test_many_logs_are_read_by_several_processes_alike(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """With processes or without, the index holds the same."""
    folder = tmp_path / "nights"
    small_archive(folder, nights=9)
    monkeypatch.setattr("engine.past.build.MANY", 5)
    with PastIndex(folder, cache=tmp_path) as index:
        agrees(index, folder)
