"""The index of past nights: a derived SQLite file in the user's cache folder, never the truth.

It is looked over whenever it is opened: what the logs say now is what it answers. In doubt it is
thrown away and made anew; where it can't be kept it is made in memory for the time being.
"""

from __future__ import annotations

import hashlib
import os
import sqlite3
import time
from collections.abc import Iterable, Iterator, Sequence
from contextlib import closing, contextmanager
from datetime import date
from pathlib import Path
from types import TracebackType
from typing import Any, Self

import platformdirs

from engine.past.build import Progress, Read, read_all
from engine.past.digest import fingerprint
from engine.past.schema import SCHEMA, has_full_text, make_tables, put, sum_up, take_out

# Fewer logs than this are read each time: quicker than keeping a file for them.
FEW = 6
BUSY_S = 60.0
# So many logs go in at once, so that others get their turn and little is lost when it is cut short.
BATCH = 64
# A file that was changed so shortly before it was read could change again within the same tick of
# its disk's clock: the coarsest in use, FAT's, ticks every 2 s (from memory).
YOUNG_NS = 2_500_000_000

# What SQLite keeps beside a file in its write-ahead mode.
FILES = ("", "-wal", "-shm")
# A disk that is not there today may be there next month.
FORGOTTEN_S = 100 * 86400.0

Params = Sequence[object]


def index_path(folder: Path, cache: Path | None = None) -> Path:
    """Return where the index of a logbook is kept, by the folder's real path."""
    named = hashlib.sha256(str(folder.resolve()).encode("utf-8", "surrogateescape")).hexdigest()
    cache = cache or platformdirs.user_cache_path("warmroom")
    return cache / "past" / f"{named[:24]}.sqlite"


class PastIndex:
    """The open index of one logbook: ``ask`` it, or hand it to the functions of this room.

    ``note`` says in a sentence why it could not be kept; None when all is well.
    """

    def __init__(
        self,
        folder: Path,
        *,
        cache: Path | None = None,
        progress: Progress | None = None,
        afresh: bool = False,
    ) -> None:
        """Open and look over the index of a folder, making it first where there is none.

        ``afresh`` throws away what is kept. ``progress`` is told of long work as (done, of).
        """
        self.folder = folder
        self.note: str | None = None
        self._progress = progress
        self._path: Path | None = index_path(folder, cache)
        if len(_log_names(folder)) < FEW:
            self._path = None
        self._db = self._opened(afresh=afresh)

    def __enter__(self) -> Self:
        """Return the index itself."""
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        error: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        """Close it."""
        self.close()

    def close(self) -> None:
        """Close the file."""
        self._db.close()

    def ask(self, question: str, params: Params = ()) -> list[tuple[Any, ...]]:
        """Return the rows of a question; an index found damaged is made anew first."""
        try:
            return self._db.execute(question, params).fetchall()
        except sqlite3.OperationalError:
            raise
        except sqlite3.DatabaseError:
            self._heal()
            return self._db.execute(question, params).fetchall()

    def refresh(self) -> bool:
        """Look at every log's size and time, read those that changed; return whether any had."""
        try:
            return self._look_over()
        except sqlite3.OperationalError:
            raise
        except sqlite3.DatabaseError:
            self._heal()
            return True

    # Opening

    def _opened(self, *, afresh: bool = False) -> sqlite3.Connection:
        """Return the database, looked over; one in memory where no file can be kept."""
        attempts = [self._kept_anew] if afresh else [self._kept, self._kept_anew]
        for attempt in attempts if self._path is not None else []:
            db: sqlite3.Connection | None = None
            try:
                db = self._db = attempt()
                self._look_over()
            except (sqlite3.Error, OSError) as error:
                if db is not None:
                    db.close()
                self.note = f"the index of past nights is not kept ({_plain(error)}): made for now"
                # One that others are busy with is theirs, and not damaged.
                if getattr(error, "sqlite_errorcode", None) == sqlite3.SQLITE_BUSY:
                    break
                continue
            self.note = None
            return db
        self._db = self._in_memory()
        self._look_over()
        return self._db

    def _kept(self) -> sqlite3.Connection:
        if self._path is None:
            raise OSError("there is no place for it")
        self._path.parent.mkdir(parents=True, exist_ok=True)
        db = _connect(self._path)
        try:
            db.execute("PRAGMA journal_mode = WAL")
            db.execute("PRAGMA synchronous = NORMAL")
            with _changing(db):
                version = db.execute("PRAGMA user_version").fetchone()[0]
                empty = db.execute("SELECT count(*) FROM sqlite_schema").fetchone()[0] == 0
                if empty:
                    _sweep(self._path)
                    make_tables(db, str(self.folder.resolve()))
                elif version != SCHEMA or not self._is_ours(db):
                    raise sqlite3.DatabaseError("it is of another version or another logbook")
        except BaseException:
            db.close()
            raise
        return db

    def _is_ours(self, db: sqlite3.Connection) -> bool:
        found = db.execute("SELECT value FROM meta WHERE name = 'folder'").fetchone()
        return found is not None and found[0] == str(self.folder.resolve())

    def _kept_anew(self) -> sqlite3.Connection:
        self._throw_away()
        return self._kept()

    def _in_memory(self) -> sqlite3.Connection:
        db = _connect(":memory:")
        make_tables(db, str(self.folder.resolve()))
        return db

    def _throw_away(self) -> None:
        if self._path is not None:
            for ending in FILES:
                self._path.with_name(self._path.name + ending).unlink(missing_ok=True)

    def _heal(self) -> None:
        """Throw a damaged index away and make it anew."""
        self._db.close()
        self._db = self._opened(afresh=True)

    # Looking over

    def _look_over(self) -> bool:
        """Bring the index up to what the logs say now; return whether anything had changed."""
        known = {
            row[0]: row[1:]
            for row in self._db.execute("SELECT name, size, mtime_ns, crc, seen_ns FROM night")
        }
        names = _log_names(self.folder)
        gone = known.keys() - set(names)
        where = str(self.folder)
        changed = [
            self.folder / name for name in names if self._has_changed(where, name, known.get(name))
        ]
        self.has_full_text = has_full_text(self._db)
        if not gone and not changed:
            return self._sum_up_what_is_left()
        touched: set[str] = set()
        if gone:
            with _changing(self._db):
                for name in sorted(gone):
                    touched |= take_out(self._db, name, full_text=self.has_full_text)
                sum_up(self._db, touched)
        self._take_in(read_all(changed, self._progress), len(changed))
        return True

    def _has_changed(self, folder: str, name: str, known: tuple[int, int, int, int] | None) -> bool:
        """Say whether a log is another than the one that was read.

        One that was young when it was read, or that was only touched, is told by its content.
        """
        if known is None:
            return True
        size, mtime_ns, crc, seen_ns = known
        path = f"{folder}/{name}"
        try:
            now = os.stat(path)
            if now.st_size != size:
                return True
            if now.st_mtime_ns == mtime_ns and mtime_ns < seen_ns - YOUNG_NS:
                return False
            seen_ns = time.time_ns()
            with open(path, "rb") as file:
                is_same = fingerprint(file.read()) == crc
        except OSError:
            return size >= 0
        if is_same and now.st_mtime_ns < seen_ns - YOUNG_NS:
            with _changing(self._db):
                self._db.execute(
                    "UPDATE night SET mtime_ns = ?, seen_ns = ? WHERE name = ? AND crc = ?",
                    (now.st_mtime_ns, seen_ns, name, crc),
                )
        return not is_same

    def _take_in(self, read: Iterable[Read], count: int) -> None:
        """Put so many digests in, in batches; the totals follow at the end."""
        touched: set[str] = set()
        batch: list[Read] = []
        for place, each in enumerate(read, 1):
            batch.append(each)
            if len(batch) < BATCH and place < count:
                continue
            with _changing(self._db):
                for kept, stamp in batch:
                    touched |= put(self._db, kept, stamp, full_text=self.has_full_text)
                if count <= BATCH:
                    sum_up(self._db, touched)
                else:
                    self._db.execute("INSERT OR REPLACE INTO meta VALUES ('unsummed', 'yes')")
            batch = []
        self._sum_up_what_is_left()
        self._db.execute("PRAGMA optimize")

    def _sum_up_what_is_left(self) -> bool:
        """Make all totals anew where logs went in without theirs; say whether there were any.

        So a build that was cut short is finished by whoever opens the index next.
        """
        if not self._db.execute("SELECT 1 FROM meta WHERE name = 'unsummed'").fetchall():
            return False
        with _changing(self._db):
            sum_up(self._db, None)
            self._db.execute("DELETE FROM meta WHERE name = 'unsummed'")
        return True


def _sweep(path: Path) -> None:
    """Remove the indexes beside one whose logbook is gone and that none has changed for long."""
    for other in path.parent.glob("*.sqlite"):
        try:
            if other == path or time.time() - other.stat().st_mtime < FORGOTTEN_S:
                continue
            with closing(sqlite3.connect(f"{other.as_uri()}?mode=ro", uri=True)) as db:
                found = db.execute("SELECT value FROM meta WHERE name = 'folder'").fetchone()
            if found is not None and not Path(found[0]).exists():
                for ending in FILES:
                    other.with_name(other.name + ending).unlink(missing_ok=True)
        except (sqlite3.Error, OSError):
            # Not ours to judge: it stays.
            continue


def _log_names(folder: Path) -> list[str]:
    """Return the names of `engine.log.night_logs`, sorted: thousands in a few milliseconds."""
    try:
        names = os.listdir(folder)
    except FileNotFoundError:
        return []
    return sorted(name for name in names if name.endswith(".toml") and _is_date(name[:-5]))


def _is_date(text: str) -> bool:
    try:
        date.fromisoformat(text)
    except ValueError:
        return False
    return True


def _connect(path: Path | str) -> sqlite3.Connection:
    db = sqlite3.connect(path, timeout=BUSY_S, isolation_level=None, check_same_thread=False)
    db.execute("PRAGMA cache_size = -65536")
    return db


@contextmanager
def _changing(db: sqlite3.Connection) -> Iterator[None]:
    """Change the database in one piece, alone; not at all when anything goes wrong."""
    db.execute("BEGIN IMMEDIATE")
    try:
        yield
    except BaseException:
        db.execute("ROLLBACK")
        raise
    db.execute("COMMIT")


def _plain(error: Exception) -> str:
    return (error.strerror if isinstance(error, OSError) else None) or str(error)
