"""Reading a log, whatever happened to it: everything sound is used, everything else is said.

Readers never change a file. A damaged stretch in the middle is shown and passed over. An entry that
has its crc line and can be read, though the crc is wrong, was changed by hand or damaged: it is
used, and said. One without its crc line was cut short: it is never used, since what is left of it
may say something that was never written.
"""

from __future__ import annotations

import math
import time
from dataclasses import dataclass
from datetime import date
from pathlib import Path

from engine.errors import Fault, LogError
from engine.log.blocks import Block, split_blocks
from engine.log.events import ClockStep, Event, Foreign
from engine.log.header import SCHEMA, Header, is_unfinished, read_header
from engine.log.keys import complaints, from_values
from engine.logbook.text import visible
from engine.times import SECONDS_PER_DAY

RAW_SHOWN = 60
# Times in the file are rounded to the millisecond: less than this is no step back.
ROUNDING_S = 0.002
# How many stretches away an entry may be to be named as the neighbour of a damaged one.
NEAR = 8
# An entry half written is whole a moment later, even on a slow disk; a torn one stays torn.
LOOKS_AGAIN, LOOKS_AGAIN_S = 3, 0.1


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
    schema: object = SCHEMA


def read_log(path: Path) -> LogReading:
    """Return everything a log holds; LogError when it can't be read or is no night log."""
    try:
        data = path.read_bytes()
    except OSError as error:
        raise LogError(f"{path}: {error.strerror}") from None
    return read_log_bytes(path, data)


def read_log_bytes(path: Path, data: bytes) -> LogReading:
    """Return everything the bytes of a log hold; LogError when they are no night log."""
    try:
        head = read_header(data, _night_named(path))
    except ValueError as error:
        what = "the header was never finished" if is_unfinished(data) else str(error)
        raise LogError(f"{path}:1: {what}") from None
    findings = [Fault(path, 1, "header", what) for what in head.findings]
    blocks = split_blocks(data[head.end :], head.end, data.count(b"\n", 0, head.end) + 1)
    torn = 0
    if blocks and not blocks[-1].is_finished:
        tail = blocks.pop()
        torn = len(data) - tail.offset
        what = f"{torn} bytes at the end are torn, or just being written: {_raw(tail.raw)}"
        findings.append(Fault(path, tail.line, "", what))
    events, found = _events(path, blocks)
    findings += [*found, *_about_numbers(path, events), *_about_times(path, events)]
    sound_end = blocks[-1].end if blocks else head.end
    kept = tuple(event for _, event in events)
    return LogReading(path, head.header, kept, tuple(findings), sound_end, torn, head.schema)


def _night_named(path: Path) -> date | None:
    try:
        return date.fromisoformat(path.stem)
    except ValueError:
        return None


Placed = tuple[Block, Event]


def _events(path: Path, blocks: list[Block]) -> tuple[list[Placed], list[Fault]]:
    """Return the entries that are used, with where they stand, and what is wrong with blocks."""
    placed: list[Placed] = []
    findings: list[Fault] = []
    crlf = [block for block in blocks if block.has_crlf]
    if crlf:
        what = f"the line ends of {len(crlf)} entries are those of another system; used"
        findings.append(Fault(path, crlf[0].line, "", what))
    seen: dict[int, Block] = {}
    for place, block in enumerate(blocks):
        if block.values is None or not block.is_whole:
            findings.append(Fault(path, block.line, "", _damage(block, _around(blocks, place))))
            continue
        event = from_values(block.kind, block.values)
        if not block.is_sound:
            what = f"changed by hand or damaged; used: {_raw(block.raw)}"
            findings.append(Fault(path, block.line, _key(block, event), what))
        if event.extra or isinstance(event, Foreign):
            key = _key(block, event)
            findings += [Fault(path, block.line, key, what) for what in complaints(event)]
        before = seen.setdefault(event.n, block)
        if event.n and before is not block:
            is_same = before.raw == block.raw
            what = f"its number stands at line {before.line} already" + (
                ", and all the rest of it too; passed over" if is_same else ", with other values"
            )
            findings.append(Fault(path, block.line, _key(block, event), what))
            if is_same:
                continue
        placed.append((block, event))
    return placed, findings


def _key(block: Block, event: Event) -> str:
    return f"{block.kind} {event.n}"


def _around(blocks: list[Block], place: int) -> str:
    """Return between which entries a stretch stands, in words.

    Looks no further than the nearest stretches: a file that is damaged all over has no neighbours.
    """
    before = reversed(blocks[max(place - NEAR, 0) : place])
    after = iter(blocks[place + 1 : place + 1 + NEAR])
    found = [
        f"{word} {_called(block)}"
        for word, near in (("after", before), ("before", after))
        if (block := next((each for each in near if each.is_finished), None))
    ]
    return " and ".join(found)


def _called(block: Block) -> str:
    return visible(f"{block.kind} {(block.values or {}).get('n', '?')}"[:RAW_SHOWN])


def _damage(block: Block, around: str) -> str:
    """Return what is said of a stretch that is not used: how far it goes, where, and its text."""
    lines = f"to line {block.last_line} " if block.last_line > block.line else ""
    where = f"({around}) " if around else ""
    state = "cut short or damaged" if block.kind else "no entry"
    return f"{state}, {lines}{where}passed over: {_raw(block.raw)}"


def _about_numbers(path: Path, events: list[Placed]) -> list[Fault]:
    """Return a finding for each entry without a number or out of turn, and for each gap."""
    findings = []
    lines: dict[int, int] = {}
    greatest = 0
    for block, event in events:
        if event.n == 0:
            findings.append(Fault(path, block.line, block.kind, "it has no number"))
        elif event.n < greatest:
            what = f"it stands behind entry {greatest}; moved"
            findings.append(Fault(path, block.line, _key(block, event), what))
        lines.setdefault(event.n, block.line)
        greatest = max(greatest, event.n)
    numbers = sorted(lines.keys() - {0})
    for before, after in zip([0, *numbers], numbers, strict=False):
        if after - before > 1:
            gap = f"{before + 1}" if after - before == 2 else f"{before + 1} to {after - 1}"
            findings.append(Fault(path, lines[after], "", f"entry {gap} is missing before this"))
    return findings


def _about_times(path: Path, events: list[Placed]) -> list[Fault]:
    """Return a finding for each entry without a time, or earlier than the one before it.

    A clock that was set back is no finding where the log says so itself.
    """
    findings = []
    latest: Event | None = None
    for block, event in sorted(events, key=lambda placed: placed[1].n):
        if math.isnan(event.t_mjd):
            findings.append(Fault(path, block.line, _key(block, event), "it has no time"))
            continue
        if latest is not None and not isinstance(event, ClockStep):
            back_s = (latest.t_mjd - event.t_mjd) * SECONDS_PER_DAY
            if back_s > ROUNDING_S:
                what = f"its time is {back_s:.3f} s before that of entry {latest.n}"
                findings.append(Fault(path, block.line, _key(block, event), what))
        latest = event
    return findings


def _raw(data: bytes) -> str:
    text = visible(data[: 4 * RAW_SHOWN].decode("utf-8", "replace").strip())
    return text if len(text) <= RAW_SHOWN else text[:RAW_SHOWN] + "..."


def is_night_log(path: Path) -> bool:
    """Say whether a file's name is that of a night log: a date and ``.toml``."""
    return path.suffix == ".toml" and _night_named(path) is not None


def night_logs(folder: Path) -> list[Path]:
    """Return the night logs of a logbook, the oldest first."""
    return sorted(path for path in folder.glob("*.toml") if is_night_log(path))


def audit(folder: Path) -> list[Fault]:
    """Return everything that is wrong in any night log of a logbook.

    What is only being written meanwhile is not.
    """
    findings: list[Fault] = []
    for path in night_logs(folder):
        try:
            findings += _settled(path).findings
        except LogError as error:
            what = str(error).removeprefix(f"{path}:").removeprefix("1:").strip()
            findings.append(Fault(path, 1, "", what))
    return findings


def _settled(path: Path) -> LogReading:
    """Return what a log holds once nobody is in the middle of an entry; LogError as `read_log`."""
    reading = read_log(path)
    for _ in range(LOOKS_AGAIN):
        if not reading.torn:
            break
        time.sleep(LOOKS_AGAIN_S)
        reading = read_log(path)
    return reading
