"""Changing the logbook: a target added, a key of one changed, a file taken in, any of it put back.

Files belong to their owners: added targets go to ``targets/added.toml``, which warmroom makes, and
a change in a file touches the value it is about and no other byte. What a file would hold is read
by the logbook's own loader, together with all other files, before it takes the old one's place in
one step; a fault, a full disk or a crash leaves the old file as it was. A table of targets
(``.csv``, ``.ecsv``, ``.vot``) is not edited.
"""

from __future__ import annotations

import os
import tempfile
import tomllib
from bisect import bisect_left
from collections.abc import Mapping
from contextlib import suppress
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path

import tomli_w

from engine.errors import Fault, LogbookFaults, NotNow
from engine.logbook.files import (
    LARGEST_BYTES,
    TABLE_ENDINGS,
    Unreadable,
    as_text,
    parse_toml,
    read_text,
    target_files,
)
from engine.logbook.lines import LineIndex, Spans, spans_of_keys
from engine.logbook.load import Logbook, load_logbook
from engine.logbook.text import shown

ADDED = "added.toml"
HEAD = "# Targets added at the console. Edit them here as in any file of targets.\n"
BOM = b"\xef\xbb\xbf"
READABLE = 0o644


@dataclass(frozen=True, slots=True)
class Change:
    """A change that was made: what the file held (None: it was not there), and the new logbook."""

    path: Path
    before: bytes | None
    after: bytes
    logbook: Logbook


@dataclass(frozen=True, slots=True)
class Standing:
    """Where a target stands: its file, its place among the targets of it, its line."""

    path: Path
    place: int
    line: int

    @property
    def is_in_table(self) -> bool:
        """Whether it is the row of a table, which is not edited here."""
        return self.path.suffix.lower() in TABLE_ENDINGS


def add_target(folder: Path, values: Mapping[str, object]) -> Change:
    """Add a target, given as its keys in a file; LogbookFaults when it can't be one."""
    path = folder / "targets" / ADDED
    before = _bytes(path)
    body = "".join(f"{key} = {value_text(value)}\n" for key, value in values.items())
    old = before if before is not None else HEAD.encode()
    end = b"\n" if old.endswith(b"\n") else b"\n\n"
    return _carry_out(folder, path, before, old + end + f"[[target]]\n{body}".encode())


def change_target(folder: Path, name: str, key: str, value: object) -> Change:
    """Give a key of a target another value (None takes the key away), in its own file.

    LogbookFaults when the logbook would have faults with it, NotNow when it can't be done here.
    """
    where = standing(folder, name)
    if where is None:
        raise NotNow(f"{shown(name)} stands in no file: it came into this night alone")
    if where.is_in_table:
        raise NotNow(
            f"{shown(name)} is a row of {where.path.name}, line {where.line}: edit it there"
        )
    before = _bytes(where.path)
    if before is None:
        raise NotNow(f"{where.path} is gone")
    try:
        after = _with_value(before, ("target", where.place, key), value)
    except Unreadable as why:
        raise LogbookFaults([Fault(where.path, why.line, "", str(why))]) from None
    return _carry_out(folder, where.path, before, after)


def import_file(folder: Path, source: Path) -> Change:
    """Copy a file of targets into ``targets/``; LogbookFaults with all that is wrong in it."""
    path = folder / "targets" / source.name
    if source.suffix.lower() not in (".toml", *TABLE_ENDINGS) or source.name.startswith("."):
        raise NotNow(f"{shown(source.name)}, expected a .toml, .csv, .ecsv or .vot file of targets")
    if path.exists() or path.is_symlink():
        raise NotNow(f"the logbook has {path.relative_to(folder)} already")
    try:
        with source.open("rb") as file:
            data = file.read(LARGEST_BYTES + 1)
    except OSError as error:
        raise NotNow(f"{source}: {error.strerror}") from None
    try:
        return _carry_out(folder, path, None, data)
    except LogbookFaults as found:
        told = [
            Fault(source if f.path == path else f.path, f.line, f.key, f.what) for f in found.faults
        ]
        raise LogbookFaults(told) from None


def put_back(folder: Path, change: Change) -> Logbook:
    """Undo a change whose file was not touched since; return the logbook as it then is."""
    if _bytes(change.path) != change.after:
        raise NotNow(f"{change.path.name} was changed since: it is left as it is")
    if change.before is not None:
        return _carry_out(folder, change.path, change.after, change.before).logbook
    aside = change.path.with_name(f".{change.path.name}.taken-back")
    os.replace(change.path, aside)
    try:
        logbook = load_logbook(folder)
    except LogbookFaults:
        os.replace(aside, change.path)
        raise
    aside.unlink()
    _sync_folder(change.path.parent)
    return logbook


def standing(folder: Path, name: str) -> Standing | None:
    """Return where a target of a sound logbook stands; None when no file has it."""
    from engine.logbook.tables import read_table

    for path in target_files(folder, []):
        try:
            text = read_text(path)
            if path.suffix.lower() in TABLE_ENDINGS:
                table = read_table(text, path.suffix.lower())
                rows, lines = table.rows, table.line_of
            else:
                rows, lines = parse_toml(text).get("target", []), LineIndex(text).line_of
        except Unreadable:
            continue
        for place, row in enumerate(rows):
            if row.get("name") == name:
                return Standing(path, place, lines(("target", place)))
    return None


def value_text(value: object) -> str:
    """Return a value as it stands behind ``key =`` in a file of targets, on one line."""
    match value:
        case list() | tuple():
            return f"[{', '.join(value_text(each) for each in value)}]"
        case dict():
            inside = ", ".join(f"{key} = {value_text(each)}" for key, each in value.items())
            return f"{{ {inside} }}"
        case datetime():
            return value.astimezone(UTC).isoformat().replace("+00:00", "Z")
        case _:
            text = tomli_w.dumps({"v": value}, multiline_strings=False)
            return text.removeprefix("v = ").removesuffix("\n")


def _with_value(data: bytes, path: tuple[str | int, ...], value: object) -> bytes:
    """Return a file's bytes with another value at a path; NotNow when only a person can do it."""
    text = as_text(data)
    mark = BOM if data.startswith(BOM) else b""
    before = parse_toml(text)
    new = mark + _spliced(text, path, value).encode()
    meant = _changed(before, path, value)
    try:
        if tomllib.loads(as_text(new).replace("\r\n", "\n")) == meant:
            return new
    except (ValueError, RecursionError):
        pass
    raise NotNow(f"{path[-1]} is written in a way that is not edited here: change it in the file")


def _changed(tables: dict[str, object], path: tuple[str | int, ...], value: object) -> object:
    """Return what a file must hold after a change, worked out from what it held."""
    kind, place, key = path
    targets = tables[str(kind)]
    assert isinstance(targets, list)
    changed = [dict(each) for each in targets]
    if value is None:
        changed[int(place)].pop(str(key), None)
    else:
        changed[int(place)][str(key)] = tomllib.loads(f"v = {value_text(value)}")["v"]
    return {**tables, str(kind): changed}


def _spliced(text: str, path: tuple[str | int, ...], value: object) -> str:
    """Return a text with the value at a path exchanged, put in or taken out, and nothing else."""
    plain = text.replace("\r\n", "\n")
    spans = spans_of_keys(text)
    pair = spans.pairs.get(path)
    line_end = "\r\n" if "\r\n" in text else "\n"
    if pair is None and value is None:
        return text
    if pair is None:
        at, new = _room_for(spans, path[:-1], plain), f"{path[-1]} = {value_text(value)}{line_end}"
        begin = end = at
        if plain[at - 1 : at] != "\n":
            new = line_end + new.removesuffix(line_end)
    elif value is None:
        begin, end = _whole_lines(plain, *pair)
        new = "".join(f"{each}{line_end}" for each in _comments_in(plain, spans, *pair))
    else:
        begin, end = pair
        kept = "".join(f"{each}{line_end}" for each in _comments_in(plain, spans, *pair))
        new = f"{kept}{path[-1]} = {value_text(value)}"
    first, last = _in_original(text, begin), _in_original(text, end)
    return text[:first] + new + text[last:]


def _room_for(spans: Spans, table: tuple[str | int, ...], text: str) -> int:
    """Return where a new key of a table goes: behind the line of its last key, or of its header."""
    ends = [end for path, (_, end) in spans.pairs.items() if path[:-1] == table]
    at = max(ends, default=spans.heads.get(table, len(text)))
    found = text.find("\n", at)
    return len(text) if found < 0 else found + 1


def _whole_lines(text: str, begin: int, end: int) -> tuple[int, int]:
    """Return a stretch with the end of its line when nothing else stands on it."""
    found = text.find("\n", end)
    after = len(text) if found < 0 else found
    is_alone = (
        not text[end:after].strip() and not text[text.rfind("\n", 0, begin) + 1 : begin].strip()
    )
    return (text.rfind("\n", 0, begin) + 1, min(after + 1, len(text))) if is_alone else (begin, end)


def _comments_in(text: str, spans: Spans, begin: int, end: int) -> list[str]:
    """Return the comments inside a value that goes away: they are kept, above it."""
    return [text[first:last] for first, last in spans.comments if begin <= first < end]


def _in_original(text: str, at: int) -> int:
    """Return an offset into a text for one into the same with all line ends as one character."""
    if "\r\n" not in text:
        return at
    places: list[int] = []
    begin = text.find("\r\n")
    while begin >= 0:
        places.append(begin - len(places))
        begin = text.find("\r\n", begin + 2)
    return at + bisect_left(places, at)


def _carry_out(folder: Path, path: Path, before: bytes | None, after: bytes) -> Change:
    """Check the logbook as it would be, then let a file's new content take the old one's place."""
    logbook = load_logbook(folder, {path: after})
    try:
        _replace(path, before, after)
    except OSError as error:
        raise NotNow(f"{path.name} can't be written: {error.strerror or error}") from None
    return Change(path, before, after, logbook)


def _replace(path: Path, before: bytes | None, after: bytes) -> None:
    """Put a file's new content in its place in one step; NotNow when it was changed meanwhile."""
    path.parent.mkdir(exist_ok=True)
    real = path.resolve()
    fd, name = tempfile.mkstemp(prefix=f".{real.name}.", suffix=".new", dir=real.parent)
    new = Path(name)
    try:
        with os.fdopen(fd, "wb") as file:
            file.write(after)
            file.flush()
            os.fchmod(
                file.fileno(), real.stat().st_mode & 0o7777 if before is not None else READABLE
            )
            os.fsync(file.fileno())
        if _bytes(path) != before:
            raise NotNow(f"{path.name} was changed by somebody else just now: nothing was written")
        os.replace(new, real)
    except BaseException:
        with suppress(OSError):
            new.unlink()
        raise
    _sync_folder(real.parent)


def _sync_folder(folder: Path) -> None:
    fd = os.open(folder, os.O_RDONLY)
    try:
        # Some network disks sync no folders: the file itself is safe all the same.
        with suppress(OSError):
            os.fsync(fd)
    finally:
        os.close(fd)


def _bytes(path: Path) -> bytes | None:
    try:
        return path.read_bytes()
    except FileNotFoundError:
        return None
    except OSError as error:
        raise NotNow(f"{path.name} can't be read: {error.strerror}") from None
