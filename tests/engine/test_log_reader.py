"""What a reader finds in logs that are whole, changed by hand, damaged, doubled or out of turn."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

from engine.errors import LogError
from engine.log import (
    ClockStep,
    Event,
    Header,
    LogReading,
    Note,
    audit,
    night_logs,
    read_log,
)
from engine.log.blocks import block_bytes
from engine.log.header import header_bytes
from engine.log.keys import to_values
from engine.log.reader import read_log_bytes
from engine.times import datetime_from_mjd
from tests.engine.log_nights import (
    NAME,
    NIGHT,
    at,
    blocks_of,
    full_header,
    header,
    log_bytes,
    night,
    read_plainly,
)

PATH = Path(NAME)


def notes(*numbers: int) -> list[Event]:
    """Return a note for each number, a minute apart."""
    return [Note(text=f"note {n}").stamped(n, at(n)) for n in numbers]


def reading(data: bytes) -> LogReading:
    """Return what is read from bytes."""
    return read_log_bytes(PATH, data)


def said(data: bytes) -> list[tuple[int, str]]:
    """Return the findings: line and text."""
    return [(finding.line, finding.what) for finding in reading(data).findings]


def line_of(data: bytes, text: bytes, count: int = 0) -> int:
    """Return the line on which a text stands, from 1."""
    return [n for n, line in enumerate(data.split(b"\n"), start=1) if text in line][count]


def test_a_whole_night_is_read_as_tomllib_reads_it() -> None:
    """Every value of every entry agrees with what plain tomllib finds, and nothing is said."""
    events = night(40)
    data = log_bytes(events)
    found = reading(data)
    assert found.findings == ()
    assert list(found.events) == events
    assert [(kind, values) for kind, values in map(to_values, found.events)] == read_plainly(data)
    assert (found.sound_end, found.torn) == (len(data), 0)


def test_the_header_stands_alone() -> None:
    """Everything of the observatory comes back, and its crc is checked."""
    for meant in (header(), full_header()):
        data = header_bytes(meant)
        assert reading(data).header == meant
        assert reading(data).findings == ()


def test_names_in_the_header_are_written_safely() -> None:
    """Observers come from keyboards: any text, and nothing of it raw."""
    meant = Header(NIGHT, ('"R.\u202e\x1b[2J\n[site]', "\U000e0041"), "warmroom", {})
    data = header_bytes(meant)
    assert reading(data).header == meant
    assert not set("\u202e\x1b\U000e0041") & set(data.decode())


def test_a_changed_header_is_used_and_said() -> None:
    """A typo put right by hand is no reason to lose a night."""
    data = log_bytes(night(2)).replace(b"R. Okonjo", b"R. Okonja")
    found = reading(data)
    assert found.header.observers[0] == "R. Okonja"
    assert [f.what for f in found.findings] == [
        "the header was changed by hand or is damaged; used"
    ]
    assert len(found.events) == 4


@pytest.mark.parametrize(
    ("old", "new", "what"),
    [
        (b"date = 2027-03-14", b"date = 2027-03-1\xff", "can't be read"),
        (b"[header]", b"[hXader]", "does not end with its crc"),
        (b"schema = 1", b"schema = 2", "schema 2, this version knows 1"),
        (b"date = 2027-03-14", b"date = 2027-03-15", "the header says night 2027-03-15"),
        (b"date = 2027-03-14", b"date = 7", "the header says night 7"),
        (b"[night]", b"[knight]", "the header says night None"),
        (b'observers = ["R. Okonjo", "I. Varga"]', b"observers = 5", "changed by hand"),
    ],
)
def test_a_damaged_header_never_keeps_the_night_from_being_read(
    old: bytes, new: bytes, what: str
) -> None:
    """All entries are there, and what is wrong with the header is said, at line 1."""
    events = night(3)
    data = log_bytes(events)
    assert old in data
    found = reading(data.replace(old, new, 1))
    assert list(found.events) == events
    assert any(what in finding.what and finding.line == 1 for finding in found.findings)


@pytest.mark.parametrize("data", [b"", b"hello\n", b"\x00" * 400, header_bytes(header())[:-9]])
def test_what_is_no_night_log_is_an_error_with_its_line(data: bytes) -> None:
    """An empty file, another file, a header that was never finished."""
    with pytest.raises(LogError, match=rf"^{re.escape(NAME)}:1: "):
        reading(data)


def test_an_entry_changed_by_hand_is_used_and_said() -> None:
    """It parses and has its end, so it is what somebody wants; its crc tells of the change."""
    data = log_bytes(notes(1, 2, 3)).replace(b"note 2", b"note two")
    found = reading(data)
    assert [event.text for event in found.events if isinstance(event, Note)] == [
        "note 1", "note two", "note 3",
    ]  # fmt: skip
    (finding,) = found.findings
    assert finding.line == line_of(data, b"[[note]]", 1)
    assert finding.key == "note 2"
    assert finding.what.startswith("changed by hand or damaged; used: [[note]]")


def test_damage_in_the_middle_is_shown_with_lines_text_and_neighbours() -> None:
    """The damaged entry is passed over; those around it are used."""
    data = log_bytes(notes(1, 2, 3)).replace(b'"note 2"', b'"note 2')
    found = reading(data)
    assert [event.n for event in found.events] == [1, 3]
    begin = line_of(data, b"[[note]]", 1)
    (damage, gap) = found.findings
    assert damage.line == begin
    assert f"to line {begin + 4} (after note 1 and before note 3) passed over: [[note]]" in (
        damage.what
    )
    assert (gap.line, gap.what) == (
        line_of(data, b"[[note]]", 2),
        "entry 2 is missing before this",
    )


def test_an_entry_without_its_crc_is_never_used() -> None:
    """Cut at the end of a line it parses, and may say what was never written."""
    whole = blocks_of(notes(2))
    cut = whole[: whole.rindex(b"crc")]
    data = log_bytes(notes(1)) + cut + blocks_of(notes(3))
    assert [event.n for event in reading(data).events] == [1, 3]
    assert [what for _, what in said(data) if "cut short or damaged" in what]
    at_the_end = log_bytes(notes(1)) + cut
    found = reading(at_the_end)
    assert [event.n for event in found.events] == [1]
    assert found.torn == len(cut) - 1
    assert found.sound_end == len(log_bytes(notes(1)))


def test_text_between_entries_is_shown() -> None:
    """A remark written into the file is no entry, and stays."""
    data = log_bytes(notes(1)) + b"# seen by me\n" + blocks_of(notes(2))
    assert said(data) == [
        (
            line_of(data, b"# seen"),
            "no entry, (after note 1 and before note 2) passed over: # seen by me",
        )
    ]


def test_missing_doubled_and_moved_entries_are_said() -> None:
    """Numbers show what happened to a file, with the line of each."""
    one, two, three, five = (blocks_of([event]) for event in notes(1, 2, 3, 5))
    head = header_bytes(header())

    data = head + one + five
    assert said(data) == [(line_of(data, b"[[note]]", 1), "entry 2 to 4 is missing before this")]
    data = head + one + two + two + three
    (line, what), *more = said(data)
    assert not more
    assert line == line_of(data, b"[[note]]", 2)
    first = line_of(data, b"[[note]]", 1)
    assert what == (
        f"its number stands at line {first} already, and all the rest of it too; passed over"
    )
    assert [event.n for event in reading(data).events] == [1, 2, 3]

    data = head + one + three + two
    assert said(data) == [(line_of(data, b"[[note]]", 2), "it stands behind entry 3; moved")]


def test_two_entries_of_one_number_are_both_used() -> None:
    """Two consoles on a disk whose lock failed: neither record may vanish."""
    other = Note(text="the other console's").stamped(2, at(2.5))
    data = log_bytes([*notes(1, 2), other])
    assert [event.n for event in reading(data).events] == [1, 2, 2]
    assert [what for _, what in said(data)] == [
        f"its number stands at line {line_of(data, b'[[note]]', 1)} already, with other values"
    ]


def test_times_that_go_back_are_findings_unless_the_log_says_why() -> None:
    """A clock that was set back: an event says so, or the reader does."""
    back: list[Event] = [*notes(1, 2), Note(text="x").stamped(3, at(1.5))]
    data = log_bytes(back)
    assert said(data) == [
        (line_of(data, b"[[note]]", 2), "its time is 30.000 s before that of entry 2")
    ]
    step = ClockStep(seconds=-30.0).stamped(3, at(1.5))
    assert said(log_bytes([*notes(1, 2), step, Note(text="x").stamped(4, at(1.5))])) == []


def test_an_entry_without_number_or_time_is_used_and_said() -> None:
    """A person wrote it in: it has its crc line, so it was finished."""
    data = log_bytes(notes(1)) + b'\n[[note]]\ntext = "by hand"\ncrc = "00000000"\n'
    found = reading(data)
    assert [event.n for event in found.events] == [1, 0]
    assert [what for _, what in said(data)][1:] == ["it has no number", "it has no time"]


def test_an_entry_of_an_unknown_kind_is_kept_and_said() -> None:
    """A later version wrote it."""
    data = log_bytes(notes(1)) + block_bytes("telemetry", {"n": 2, "t": datetime_from_mjd(at(2))})
    assert said(data) == [(line_of(data, b"[[telemetry]]"), "unknown kind")]
    assert [event.kind for event in reading(data).events] == ["note", "foreign"]


def test_a_damaged_number_does_not_keep_the_night_from_going_on() -> None:
    """It is no number of an entry, if it is beyond all that a night can have."""
    data = log_bytes(notes(1)).replace(b"n = 1\n", b"n = 1000000000000000000\n")
    assert [event.n for event in reading(data).events] == [0]
    assert "it has no number" in [what for _, what in said(data)]


def test_line_ends_of_another_system_and_a_byte_order_mark_cost_nothing() -> None:
    """An editor saved the file its own way: one finding, and all entries as they were."""
    events = night(5)
    data = log_bytes(events)
    found = reading(data.replace(b"\n", b"\r\n"))
    assert list(found.events) == events
    assert [f.what for f in found.findings] == [
        "the line ends of 10 entries are those of another system; used"
    ]
    assert (found.torn, found.sound_end) == (0, len(data) + data.count(b"\n"))
    found = reading(b"\xef\xbb\xbf" + data)
    assert list(found.events) == events
    assert [f.what for f in found.findings] == [
        "a byte-order mark stands before the header: saved by an editor"
    ]


@pytest.mark.parametrize(
    "tail",
    [b"\n[", b"\n[[", b"\n[[no", b"\x00" * 512, b"\n[[note]]\n\x00\x00", b"\xff", b"\n[[x]]"],
)
def test_a_torn_tail_does_not_touch_the_entry_before_it(tail: bytes) -> None:
    """However the next write was torn, what was acknowledged is read."""
    events = notes(1, 2)
    data = log_bytes(events)
    found = reading(data + tail)
    assert list(found.events) == events
    assert found.sound_end == len(data)
    assert found.torn == len(tail.lstrip(b"\n"))
    assert "torn" in found.findings[0].what


def test_logs_are_found_by_their_names_and_audited(tmp_path: Path) -> None:
    """Only ``DATE.toml`` is a night; every fault of every night, with its line."""
    (tmp_path / NAME).write_bytes(log_bytes(notes(1, 3)))
    (tmp_path / "2027-03-15.toml").write_bytes(b"")
    (tmp_path / "targets.toml").write_text("")
    (tmp_path / f"{NAME}.torn-12").write_text("")
    names = [path.name for path in night_logs(tmp_path)]
    assert names == [NAME, "2027-03-15.toml"]
    faults = [(fault.path.name, fault.what) for fault in audit(tmp_path)]
    assert faults == [
        (NAME, "entry 2 is missing before this"),
        ("2027-03-15.toml", "the header was never finished"),
    ]
    with pytest.raises(LogError, match="No such file"):
        read_log(tmp_path / "2027-03-16.toml")


def test_an_entry_that_is_just_being_written_is_no_fault(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Half of it is there at the first look; a tail that stays torn is told."""
    whole = log_bytes(notes(1, 2))
    (tmp_path / NAME).write_bytes(whole[:-20])
    pauses: list[float] = []
    monkeypatch.setattr("engine.log.reader.time.sleep", pauses.append)
    (fault,) = audit(tmp_path)
    assert "are torn, or just being written" in fault.what

    def goes_on(seconds: float) -> None:
        (tmp_path / NAME).write_bytes(whole)

    monkeypatch.setattr("engine.log.reader.time.sleep", goes_on)
    assert audit(tmp_path) == []
    assert 0.1 <= sum(pauses) <= 1.0
