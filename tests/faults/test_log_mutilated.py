"""Logs mutilated in every other way: always read, never an exception, never a hang."""

from __future__ import annotations

import random
import re
import time

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.log import Event, Foreign, fold, title
from engine.logbook.text import visible
from tests.engine.log_nights import log_bytes, night
from tests.faults.log_faults import (
    reading_of,
    sample,
)

LONGEST_READ_S = 2.0

SNIPPETS = [
    b"[[note]]\n", b"\n[[", b'crc = "00000000"\n', b'"""', b"'''", b"\x00" * 40, b"\r\n",
    b"\xff\xfe", b"n = 1\n", b"n = -9\n", b"t = 2027-03-14\n", b"x = nan\n", b"[a.b.c]\n",
    b"a.b = 1\n", b"\n\n", b"x = [[[[[[[[[[", b"x = {a = {b = 1}}\n", b"\xe2\x80\xae",
    b"[header]\n", b"schema = 9\n", b"[[exposure]]\nn = 99\n", b"# remark\n",
    b"n = 123456789012345678901234567890\n", b"[[filter]]\n", b'crc = "',
    b"t = 0000-00-00T00:00:00.000Z\n", b"x = " + b"9" * 5000 + b"\n", b"=" * 30,
]  # fmt: skip


def mutilated(chance: random.Random, data: bytes) -> bytes:
    """Return a log after some of: cuts, copies, moves, flips, and text of other kinds put in."""
    torn = bytearray(data)
    for _ in range(chance.randrange(1, 5)):
        at, to = sorted(chance.randrange(len(torn) + 1) for _ in range(2))
        match chance.randrange(6):
            case 0:
                del torn[at : min(to, at + 300)]
            case 1:
                torn[at:at] = torn[at : min(to, at + 600)]
            case 2:
                torn[at:at] = chance.choice(SNIPPETS)
            case 3:
                torn[to:to] = torn[at : at + 400]
                del torn[at : at + 400]
            case 4 if torn:
                torn[at % len(torn)] ^= 1 << chance.randrange(8)
            case _:
                line_ends = [at for at, byte in enumerate(torn) if byte == 10] or [0]
                at = chance.choice(line_ends)
                torn[at:at] = b"\n" + chance.choice(SNIPPETS)
    return bytes(torn)


def check_anything(data: bytes) -> bool:
    """Read bytes, whatever they are; return whether they were a log at all.

    No exception but the one that says so with its line; every finding with a line of the file; and
    what was read can be folded and shown.
    """
    begin = time.process_time()
    found = reading_of(data)
    assert time.process_time() - begin < LONGEST_READ_S
    if found is None:
        return False
    last_line = data.count(b"\n") + 1
    assert all(1 <= finding.line <= last_line for finding in found.findings)
    for finding in found.findings:
        assert visible(str(finding)) == str(finding)
    state = fold(found.events)
    assert len(state.events) == len(found.events)
    for event in found.events:
        assert visible(title(event)) == title(event)
    return True


def test_mutilated_logs_are_never_an_exception_and_never_a_hang() -> None:
    """Three thousand logs, each mutilated in up to four ways."""
    chance = random.Random(20270314)
    data = log_bytes([*night(2), *sample(6)[4:]])
    logs = sum(check_anything(mutilated(chance, data)) for _ in range(3000))
    assert logs > 2000


@settings(max_examples=200, deadline=None)
@given(st.binary(max_size=300) | st.lists(st.sampled_from(SNIPPETS), max_size=12).map(b"".join))
def test_anything_behind_a_header_is_never_an_exception(data: bytes) -> None:
    """Bytes of any kind where entries should be, and where the header should."""
    check_anything(log_bytes([]) + data)
    check_anything(data)


@pytest.mark.parametrize(
    "data",
    [
        b"x = " + b"[" * 50_000,
        b'x = "' + b"a" * 1_000_000,
        b"a." * 20_000 + b"b = 1",
        b"[[note]]\n" * 5_000,
        b'crc = "12345678"\n' * 5_000,
        b"[[note]]\n" + b"k = 1\n" * 5_000,
        b"\n" * 1_000_000,
    ],
    ids=["nested", "open text", "dotted", "heads", "crcs", "same key", "blank"],
)
def test_text_made_to_be_slow_is_not(data: bytes) -> None:
    """Deep nesting, long lines, thousands of heads: read in a moment."""
    check_anything(log_bytes(night(1)) + b"\n[[note]]\n" + data)
    check_anything(log_bytes(night(1)) + b"\n" + data + log_bytes(night(1)))


def test_findings_show_no_raw_text_of_a_damaged_log() -> None:
    """A damaged entry can't send commands to a terminal."""
    data = log_bytes(sample(1)) + b"\n\x1b[2J\x1b]0;owned\x07\n" + log_bytes([])
    found = reading_of(data)
    assert found is not None
    texts = [finding.what for finding in found.findings]
    assert any(re.search(r"\\x1b\[2J", text) for text in texts)
    assert all("\x1b" not in text for text in texts)


def test_foreign_entries_can_be_shown() -> None:
    """Kinds and keys of later versions have a title too."""
    event: Event = Foreign(kind_in_file="telemetry", complaint="unknown kind", extra={"a": [1]})
    assert title(event) == "telemetry (unknown kind)"
