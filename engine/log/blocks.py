"""Blocks: one event as bytes on disk, and bytes on disk as blocks.

A block is ``[[kind]]``, then flat ``key = value`` lines, the last of them ``crc``: zlib.crc32 of
the bytes from ``[[`` up to that line. A block whose crc is right is exactly what was written; what
was cut, torn or changed can't pass for one.
"""

from __future__ import annotations

import re
import tomllib
import zlib
from dataclasses import dataclass
from datetime import date, datetime
from itertools import pairwise
from typing import Any

import tomli_w

from engine.times import iso_from_datetime

Value = str | int | float | bool | date | datetime | list[Any]

_CRC_LINE = re.compile(rb'crc = "([0-9a-f]{8})"\n')
_HEAD_LINE = re.compile(rb"\[\[([A-Za-z0-9_-]+)\]\]\n")

# What tomli_w writes raw and a terminal or a parser could act on: C1 controls, line and paragraph
# separators, invisible and bidi format characters.
_ESCAPED = re.compile(
    "[\x7f-\x9f\u00ad\u061c\u180e\u200b-\u200f\u2028-\u202f\u2060-\u206f\ufeff\ufff9-\ufffb]"
)
_SURROGATE = re.compile("[\ud800-\udfff]")


def crc_of(data: bytes) -> str:
    """Return the check sum of a block's bytes as eight hex digits."""
    return f"{zlib.crc32(data):08x}"


def block_bytes(kind: str, values: dict[str, Value]) -> bytes:
    """Return an event as a block, with a blank line before it and its crc last.

    ValueError when what was made does not read back as what was meant: nothing doubtful may reach
    the disk.
    """
    lines = "".join(_line(key, value) for key, value in values.items())
    body = f"[[{kind}]]\n{lines}".encode()
    data = body + f'crc = "{crc_of(body)}"\n'.encode()
    read = tomllib.loads(data.decode())[kind][0]
    crc = read.pop("crc")
    if read != {key: _as_read(value) for key, value in values.items()} or crc != crc_of(body):
        raise ValueError(f"a block of kind {kind!r} does not read back as it was meant")
    return b"\n" + data


def _line(key: str, value: Value) -> str:
    return f"{key} = {_written(value)}\n"


def _written(value: Value) -> str:
    """Return a value on one line: times with T and Z, which every parser takes, nothing raw."""
    if isinstance(value, list):
        return f"[{', '.join(_written(each) for each in value)}]"
    if isinstance(value, datetime):
        return iso_from_datetime(value)
    text = tomli_w.dumps({"v": _without_surrogates(value)}, multiline_strings=False)
    text = text.removeprefix("v = ").removesuffix("\n")
    return _ESCAPED.sub(lambda found: f"\\u{ord(found[0]):04X}", text)


def _without_surrogates(value: Value) -> Value:
    return _SURROGATE.sub("\ufffd", value) if isinstance(value, str) else value


def _as_read(value: Value) -> Value:
    """Return a value as a reader will see it: times to the millisecond, no lone surrogates."""
    if isinstance(value, list):
        return [_as_read(each) for each in value]
    if isinstance(value, datetime):
        return datetime.fromisoformat(iso_from_datetime(value))
    return _without_surrogates(value)


@dataclass(frozen=True, slots=True)
class Block:
    """One stretch of the file that begins with a ``[[kind]]`` line.

    ``sound`` says that its crc is right, ``whole`` that it ends in a crc line at all: one that was
    cut short does not. ``line`` is where it begins, from 1; ``values`` is None when it does not
    even parse.
    """

    kind: str
    values: dict[str, Value] | None
    sound: bool
    whole: bool
    line: int
    offset: int
    raw: bytes


def split_blocks(data: bytes, offset: int = 0, line: int = 1) -> list[Block]:
    """Return the blocks in a stretch of a log, whatever state they are in; never raises.

    ``offset`` and ``line`` say where in the file the stretch begins. Text before the first block,
    blank lines apart, comes back as a block without a kind.
    """
    starts = [found.start() for found in re.finditer(rb"^\[\[", data, re.MULTILINE)]
    edges = [*starts, len(data)]
    blocks = []
    if data[: edges[0]].strip():
        blocks.append(Block("", None, False, False, line, offset, data[: edges[0]]))
    at_line = line + data[: edges[0]].count(b"\n")
    for begin, end in pairwise(edges):
        raw = data[begin:end]
        blocks.append(_block(raw, at_line, offset + begin))
        at_line += raw.count(b"\n")
    return blocks


def _block(raw: bytes, line: int, offset: int) -> Block:
    head = _HEAD_LINE.match(raw)
    kind = head[1].decode() if head else ""
    crc = _CRC_LINE.search(raw)
    whole = bool(head and crc and not raw[crc.end() :].strip())
    sound = bool(whole and crc and crc_of(raw[: crc.start()]) == crc[1].decode())
    return Block(kind, _values(raw, kind), sound, whole, line, offset, raw)


def _values(raw: bytes, kind: str) -> dict[str, Value] | None:
    """Return a block's values without its crc, or None when it is no block of that kind."""
    try:
        tables = tomllib.loads(raw.decode())
        values = dict(tables[kind][0])
    except (ValueError, KeyError, TypeError, IndexError, RecursionError):
        return None
    if set(tables) != {kind} or len(tables[kind]) != 1:
        return None
    values.pop("crc", None)
    return values
