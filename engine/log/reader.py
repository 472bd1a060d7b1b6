"""Reading a log, whatever happened to it: everything sound is used, everything else is said.

Readers never change a file. A damaged stretch in the middle is shown and passed over; a block that
parses but whose crc is wrong was changed by hand or damaged: it is used, and said.
"""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path

from engine.errors import Fault, LogError
from engine.log.blocks import Block, split_blocks
from engine.log.events import Event, Foreign, from_values
from engine.log.header import Header, header_end, read_header
from engine.logbook.text import visible

RAW_SHOWN = 60


@dataclass(frozen=True, slots=True)
class LogReading:
    """What was read from one log.

    ``sound_end`` is the offset behind the last finished block (or the header): what lies beyond is
    a torn tail, ``torn`` bytes of it.
    """

    path: Path
    header: Header
    events: tuple[Event, ...]
    findings: tuple[Fault, ...]
    sound_end: int
    torn: int


def read_log(path: Path) -> LogReading:
    """Return everything a log holds; LogError when it can't be read or has no header."""
    try:
        data = path.read_bytes()
    except OSError as error:
        raise LogError(f"{path}: {error.strerror}") from None
    return read_log_bytes(path, data)


def read_log_bytes(path: Path, data: bytes) -> LogReading:
    """Return everything the bytes of a log hold; LogError when they have no header."""
    end = header_end(data)
    if end is None:
        raise LogError(f"{path}:1: the header is not whole, expected one that ends with its crc")
    try:
        header, sound = read_header(data[:end])
    except ValueError as error:
        raise LogError(f"{path}:1: {error}") from None
    findings = [] if sound else [_fault(path, 1, "header", "changed by hand or damaged; used")]
    blocks = split_blocks(data[end:], end, data[:end].count(b"\n") + 1)
    sound_end = max((b.offset + len(b.raw) for b in blocks if _stands(b)), default=end)
    kept = [b for b in blocks if b.offset < sound_end]
    tail = len(data) - sound_end if data[sound_end:].strip() else 0
    if tail:
        line = data[:sound_end].count(b"\n") + 1
        findings.append(
            _fault(path, line, "", f"{tail} bytes at the end are torn: {_raw(data[sound_end:])}")
        )
    events, found = _events(path, kept)
    return LogReading(path, header, tuple(events), tuple(findings + found), sound_end, tail)


def _stands(block: Block) -> bool:
    """Say whether a block was finished once: sound, or changed since but with its end in place."""
    return block.sound or (block.whole and block.values is not None)


def _events(path: Path, blocks: list[Block]) -> tuple[list[Event], list[Fault]]:
    events: list[Event] = []
    findings: list[Fault] = []
    seen: dict[int, int] = {}
    before = 0
    for block in blocks:
        if block.values is None:
            last = block.line + block.raw.rstrip().count(b"\n")
            what = f"damaged to line {last}, passed over: {_raw(block.raw)}"
            findings.append(_fault(path, block.line, "", what))
            continue
        event = from_values(block.kind, block.values)
        key = f"{block.kind} {event.n}"
        if not block.sound:
            findings.append(_fault(path, block.line, key, "changed by hand or damaged; used"))
        if isinstance(event, Foreign):
            findings.append(_fault(path, block.line, key, event.complaint))
        if event.n in seen:
            what = f"its number stands at line {seen[event.n]} already; passed over"
            findings.append(_fault(path, block.line, key, what))
            continue
        if event.n < before:
            findings.append(
                _fault(path, block.line, key, f"it stands behind entry {before}; moved")
            )
        seen[event.n] = block.line
        before = max(before, event.n)
        events.append(event)
    return events, findings + _missing(path, seen)


def _missing(path: Path, seen: dict[int, int]) -> list[Fault]:
    """Return a finding for each gap in the numbers, at the line of the entry behind it."""
    findings = []
    numbers = sorted(seen)
    for before, after in zip([0, *numbers], numbers, strict=False):
        if after - before > 1:
            gap = f"{before + 1}" if after - before == 2 else f"{before + 1} to {after - 1}"
            findings.append(_fault(path, seen[after], "", f"entry {gap} is missing before this"))
    return findings


def _fault(path: Path, line: int, key: str, what: str) -> Fault:
    return Fault(path, line, key, what)


def _raw(data: bytes) -> str:
    text = visible(data.decode("utf-8", "replace").strip())
    return text if len(text) <= RAW_SHOWN else text[:RAW_SHOWN] + "..."


def is_night_log(path: Path) -> bool:
    """Say whether a file's name is that of a night log: a date and ``.toml``."""
    from datetime import date

    try:
        date.fromisoformat(path.stem)
    except ValueError:
        return False
    return path.suffix == ".toml"


def night_logs(folder: Path) -> list[Path]:
    """Return the night logs of a logbook, the oldest first."""
    return sorted(path for path in folder.glob("*.toml") if is_night_log(path))


def audit(folder: Path) -> list[Fault]:
    """Return everything that is wrong in any night log of a logbook."""
    findings: list[Fault] = []
    for path in night_logs(folder):
        try:
            findings += read_log(path).findings
        except LogError as error:
            findings.append(Fault(path, 1, "", str(error).removeprefix(f"{path}:1: ")))
    return findings
