"""The tables of the index, and how a log's digest is put into them and taken out again."""

from __future__ import annotations

import sqlite3
from collections.abc import Collection
from contextlib import suppress
from dataclasses import dataclass

from engine.past.digest import FIELDS, Digest, as_json

# Raised whenever the tables, or what a digest holds, change: an index of another one is made anew.
SCHEMA = 3

_TEXT = {"target", "programme", "filter", "frame", "outcome", "why"}
_COLUMNS = ", ".join(
    f"{name} {'TEXT' if name in _TEXT else 'INTEGER' if name == 'n' else 'REAL'}" for name in FIELDS
)
TABLES = f"""
CREATE TABLE meta (name TEXT PRIMARY KEY, value TEXT) WITHOUT ROWID;
CREATE TABLE night (
    id INTEGER PRIMARY KEY, name TEXT NOT NULL UNIQUE,
    size INTEGER, mtime_ns INTEGER, crc INTEGER, seen_ns INTEGER,
    night TEXT, state TEXT, entries INTEGER, dark_s REAL, site TEXT, filters TEXT, line TEXT);
CREATE TABLE seeing (night INTEGER PRIMARY KEY, data BLOB);
CREATE TABLE images (night INTEGER PRIMARY KEY, data BLOB);
CREATE TABLE exposure (night INTEGER NOT NULL, place INTEGER NOT NULL, {_COLUMNS}, judged TEXT);
CREATE INDEX exposure_of_night ON exposure (night, place);
CREATE INDEX exposure_of_target
    ON exposure (target, night, place, outcome, filter, seconds, credit);
CREATE INDEX exposure_not_good ON exposure (outcome, judged, why) WHERE outcome <> 'good';
CREATE TABLE tally (
    night INTEGER, target TEXT, programme TEXT, filter TEXT, seconds REAL, outcome TEXT,
    count INTEGER, exposed_s REAL, credit REAL, first_mjd REAL, last_mjd REAL);
CREATE INDEX tally_of_night ON tally (night);
CREATE INDEX tally_of_target ON tally (target);
CREATE TABLE total (
    target TEXT, programme TEXT, filter TEXT, seconds REAL, outcome TEXT,
    count INTEGER, exposed_s REAL, credit REAL, first_mjd REAL, last_mjd REAL, nights INTEGER);
CREATE INDEX total_of_target ON total (target);
CREATE TABLE extent (
    night INTEGER, quantity TEXT, least REAL, most REAL, PRIMARY KEY (quantity, night)
) WITHOUT ROWID;
CREATE INDEX extent_of_night ON extent (night);
CREATE TABLE words (
    id INTEGER PRIMARY KEY, night INTEGER NOT NULL, n INTEGER, mjd REAL, kind TEXT, target TEXT,
    text TEXT);
CREATE INDEX words_of_night ON words (night);
"""
FULL_TEXT = "CREATE VIRTUAL TABLE words_found USING fts5 (text, target)"

# With more targets than this all totals are made at once.
MANY_TARGETS = 300
_OF_A_NIGHT = ("seeing", "images", "exposure", "tally", "extent", "words")
_EXPOSURE_MARKS = ", ".join("?" * (len(FIELDS) + 3))


@dataclass(frozen=True, slots=True)
class Stamp:
    """By what a file is known again: size, time of change, check sum; and when it was read."""

    size: int
    mtime_ns: int
    crc: int
    seen_ns: int


def make_tables(db: sqlite3.Connection, folder: str) -> None:
    """Make the tables in an empty database; without full-text search where SQLite has none."""
    for statement in TABLES.split(";\n"):
        if statement.strip():
            db.execute(statement)
    # Some SQLite libraries are built without full-text search: words are then found by letters.
    with suppress(sqlite3.OperationalError):
        db.execute(FULL_TEXT)
    db.execute("INSERT INTO meta VALUES ('folder', ?)", (folder,))
    db.execute(f"PRAGMA user_version = {SCHEMA}")


def has_full_text(db: sqlite3.Connection) -> bool:
    """Say whether this index was made with full-text search, and can be asked here."""
    try:
        db.execute("SELECT rowid FROM words_found LIMIT 1").fetchall()
    except sqlite3.OperationalError:
        return False
    return True


def put(db: sqlite3.Connection, kept: Digest, stamp: Stamp, *, full_text: bool) -> set[str]:
    """Put a log's digest in place of what was there; return the targets whose totals change."""
    touched = take_out(db, kept.name, full_text=full_text)
    account = kept.account
    line = (
        kept.findings, kept.observers, account.spent_s if account else {},
        account.lost_s if account else {}, kept.counts, kept.seeing_in_short, kept.events,
    )  # fmt: skip
    night = db.execute(
        "INSERT INTO night VALUES (NULL, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
        (
            kept.name, stamp.size, stamp.mtime_ns, stamp.crc, stamp.seen_ns, kept.night, kept.state,
            kept.entries, account.dark_s if account else None, kept.site, as_json(kept.filters),
            as_json(line),
        ),
    ).lastrowid  # fmt: skip
    db.execute("INSERT INTO seeing VALUES (?, ?)", (night, kept.seeing))
    db.execute("INSERT INTO images VALUES (?, ?)", (night, kept.images))
    db.executemany(
        f"INSERT INTO exposure VALUES ({_EXPOSURE_MARKS})",
        ((night, place, *row) for place, row in enumerate(kept.exposures)),
    )
    db.executemany(
        "INSERT INTO tally VALUES (?, ?, ?, ?, ?, ?, ?, ?, ?, ?, ?)",
        ((night, *row) for row in kept.tally),
    )
    db.executemany("INSERT INTO extent VALUES (?, ?, ?, ?)", ((night, *r) for r in kept.extents))
    for each in kept.texts:
        said = (night, each.n, each.mjd, each.kind, each.target, each.text)
        row = db.execute("INSERT INTO words VALUES (NULL, ?, ?, ?, ?, ?, ?)", said).lastrowid
        if full_text:
            db.execute(
                "INSERT INTO words_found (rowid, text, target) VALUES (?, ?, ?)",
                (row, each.text, each.target),
            )
    return touched | {str(row[0]) for row in kept.tally}


def take_out(db: sqlite3.Connection, name: str, *, full_text: bool) -> set[str]:
    """Take a log out of the index; return the targets whose totals change."""
    found = db.execute("SELECT id FROM night WHERE name = ?", (name,)).fetchone()
    if found is None:
        return set()
    touched = {
        row[0] for row in db.execute("SELECT DISTINCT target FROM tally WHERE night = ?", found)
    }
    if full_text:
        db.execute(
            "DELETE FROM words_found WHERE rowid IN (SELECT id FROM words WHERE night = ?)", found
        )
    for each in _OF_A_NIGHT:
        db.execute(f"DELETE FROM {each} WHERE night = ?", found)
    db.execute("DELETE FROM night WHERE id = ?", found)
    return touched


_SUMS = """
INSERT INTO total
SELECT target, programme, filter, seconds, outcome, sum(count), sum(exposed_s), sum(credit),
       min(first_mjd), max(last_mjd), count(*)
FROM (SELECT tally.* FROM tally CROSS JOIN night ON night.id = tally.night {which}
      ORDER BY night.name)
GROUP BY target, programme, filter, seconds, outcome
"""


def sum_up(db: sqlite3.Connection, targets: Collection[str] | None) -> None:
    """Make the totals of some targets anew; of all for None, or where that is less work."""
    if targets is None or len(targets) > MANY_TARGETS:
        db.execute("DELETE FROM total")
        db.execute(_SUMS.format(which=""))
        return
    for target in sorted(targets):
        db.execute("DELETE FROM total WHERE target = ?", (target,))
        db.execute(_SUMS.format(which="WHERE tally.target = ?"), (target,))
