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

from engine.log.values import Value, as_read, parse_doubtful, quick_values, value_text

_HEAD_LINE = re.compile(rb"\[\[([A-Za-z0-9_-]+)\]\]\r?\n")
_CRC_LINE = re.compile(rb'crc = "([0-9a-f]{8})"\r?\n')
_BLANK_LINES = re.compile(rb"[\r\n]*+")
_CRC_BEGINS = b'\ncrc = "'


def crc_of(data: bytes) -> str:
    """Return the check sum of a block's bytes as eight hex digits."""
    return f"{zlib.crc32(data):08x}"


def block_bytes(kind: str, values: dict[str, Value]) -> bytes:
    """Return an event as a block, with a blank line before it and its crc last.

    ValueError when what was made does not read back as what was meant: nothing doubtful may reach
    the disk.
    """
    lines = "".join(f"{key} = {value_text(value)}\n" for key, value in values.items())
    body = f"[[{kind}]]\n{lines}".encode()
    data = body + f'crc = "{crc_of(body)}"\n'.encode()
    meant = {key: as_read(value) for key, value in values.items()}
    meant["crc"] = crc_of(body)
    if tomllib.loads(data.decode()) != {kind: [meant]} or not split_blocks(data)[0].is_sound:
        raise ValueError(f"an entry of kind {kind!r} does not read back as it was meant")
    return b"\n" + data


@dataclass(frozen=True, slots=True)
class Block:
    """One stretch of a log: a block, whatever state it is in, or text that is none.

    ``is_whole`` says that it ends in its crc line: one that was cut short does not. ``is_sound``
    says that the crc is right, too, and ``has_crlf`` that it is so once the line ends of another
    system are made ours again. ``values`` is None when it does not even parse. ``line`` is where it
    begins, from 1, and ``offset`` the same in bytes.
    """

    kind: str
    values: dict[str, Value] | None
    is_whole: bool
    is_sound: bool
    has_crlf: bool
    line: int
    offset: int
    raw: bytes

    @property
    def is_finished(self) -> bool:
        """Whether it was finished once: it can be read, and its end is in place."""
        return self.is_whole and self.values is not None

    @property
    def end(self) -> int:
        """Where it ends, in bytes."""
        return self.offset + len(self.raw)

    @property
    def last_line(self) -> int:
        """The last line with anything of it."""
        return self.line + self.raw.rstrip(b"\r\n").count(b"\n")


def split_blocks(data: bytes, offset: int = 0, line: int = 1) -> list[Block]:
    """Return the stretches of a log, in whatever state they are; never raises.

    ``offset`` and ``line`` say where in the file the data begins. Blank lines between blocks belong
    to none. A block ends with its crc line: what follows it up to the next ``[[`` at the beginning
    of a line is a stretch of its own, so that a torn beginning of the next block can't spoil it.
    """
    blocks: list[Block] = []
    at = 0
    while at < len(data):
        begin = _BLANK_LINES.match(data, at).end()  # type: ignore[union-attr]
        line += data.count(b"\n", at, begin)
        if begin == len(data):
            break
        following = data.find(b"\n[[", begin)
        raw = data[begin : len(data) if following < 0 else following + 1]
        block = _block(raw, line, offset + begin)
        blocks.append(block)
        line += block.raw.count(b"\n")
        at = begin + len(block.raw)
    return blocks


def _block(raw: bytes, line: int, offset: int) -> Block:
    """Return the block that stretches over raw bytes, or over the first of them up to its crc."""
    head = _HEAD_LINE.match(raw)
    if head is None:
        return Block("", None, False, False, False, line, offset, raw)
    kind = head[1].decode()
    crc_at = raw.find(_CRC_BEGINS) + 1
    crc = _CRC_LINE.match(raw, crc_at) if crc_at else None
    if crc is None:
        return Block(kind, _parsed(raw, kind), False, False, False, line, offset, raw)
    raw = raw[: crc.end()]
    told = crc[1].decode()
    if crc_of(raw[:crc_at]) == told:
        values = _sound_values(raw, head.end(), crc_at, kind)
        return Block(kind, values, True, values is not None, False, line, offset, raw)
    has_crlf = crc_of(raw[:crc_at].replace(b"\r\n", b"\n")) == told
    values = _parsed(raw, kind)
    return Block(kind, values, True, has_crlf and values is not None, has_crlf, line, offset, raw)


def _sound_values(raw: bytes, begin: int, end: int, kind: str) -> dict[str, Value] | None:
    try:
        values = quick_values(raw[begin:end].decode())
    except UnicodeDecodeError:
        return None
    if values is None or "crc" in values:
        return _parsed(raw, kind, is_trusted=True)
    return values


def _parsed(raw: bytes, kind: str, *, is_trusted: bool = False) -> dict[str, Value] | None:
    """Return a block's values without its crc, or None when it is no block of that kind."""
    try:
        tables = tomllib.loads(raw.decode()) if is_trusted else parse_doubtful(raw)
        values = dict(tables[kind][0])
    except (ValueError, KeyError, TypeError, IndexError, RecursionError):
        return None
    if set(tables) != {kind} or len(tables[kind]) != 1:
        return None
    values.pop("crc", None)
    return values
