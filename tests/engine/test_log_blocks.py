"""Events as blocks and back: every kind, every value, any text; read plainly and quickly alike."""

from __future__ import annotations

import math
import sys
import tomllib
import unicodedata
from datetime import UTC, datetime, timedelta, timezone
from typing import Any

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from engine.log import KINDS, Amendment, Conditions, Event, Exposure, Foreign, Note
from engine.log.blocks import block_bytes, split_blocks
from engine.log.keys import KEYS, complaints, from_values, to_values
from engine.log.values import quick_values, value_text
from engine.log.writer import encoded
from tests.engine.log_nights import TEXTS, any_event, at, exposure, night

SURROGATES = dict.fromkeys(range(0xD800, 0xE000), "\ufffd")


def plainly(block: bytes, kind: str) -> dict[str, Any]:
    """Return what tomllib alone finds in a block, without its crc."""
    (values,) = tomllib.loads(block.decode())[kind]
    assert list(values)[-1] == "crc"
    return {key: value for key, value in values.items() if key != "crc"}


@settings(max_examples=300, deadline=None)
@given(any_event())
def test_any_event_comes_back_the_same(event: Event) -> None:
    """Write any event, read it with tomllib and with the log's own reader: all three agree."""
    as_it_stands, data = encoded(event)
    kind, meant = to_values(as_it_stands)
    assert plainly(data, kind) == meant
    (block,) = split_blocks(data)
    assert block.is_sound
    assert block.values == meant
    assert block.raw == data[1:]
    assert from_values(block.kind, block.values) == as_it_stands
    assert complaints(as_it_stands) == ()


@settings(max_examples=200, deadline=None)
@given(TEXTS)
def test_any_text_comes_back_and_leaves_nothing_raw(text: str) -> None:
    """A note keeps its text, lone surrogates apart; the file shows nothing a terminal acts on."""
    as_it_stands, data = encoded(Note(text=text).stamped(1, at(0)))
    assert isinstance(as_it_stands, Note)
    assert as_it_stands.text == text.translate(SURROGATES)
    shown = data.decode().replace("\n", "")
    assert not {unicodedata.category(each) for each in shown} & {"Cc", "Cf", "Cs", "Zl", "Zp"}


def test_every_unsafe_character_there_is_is_escaped() -> None:
    """Go through all of Unicode, as this Python knows it."""
    unsafe = [
        chr(code)
        for code in range(sys.maxunicode + 1)
        if unicodedata.category(chr(code)) in ("Cc", "Cf", "Zl", "Zp")
    ]
    assert len(unsafe) > 200
    written = value_text("".join(unsafe))
    assert not set(written) & set(unsafe)
    assert tomllib.loads(f"v = {written}")["v"] == "".join(unsafe)


@pytest.mark.parametrize(
    "text", ["a" * 10_000, "µ°″ …" * 2000, '"""', "'''", "\\u0041", "[[note]]"]
)
def test_long_and_quoting_texts_are_kept(text: str) -> None:
    """Long notes stay whole, and text that looks like TOML stays text."""
    as_it_stands, data = encoded(Note(text=text).stamped(1, at(0)))
    assert isinstance(as_it_stands, Note)
    assert as_it_stands.text == plainly(data, "note")["text"] == text
    assert len(split_blocks(data)) == 1


def test_a_block_looks_as_the_contract_says() -> None:
    """Number first, then the time with T and Z, values in order, crc last, a blank line before."""
    event = Conditions(seeing_arcsec=1.5, cloud_percent=20, target="KR 12").stamped(7, at(1 / 60))
    _, data = encoded(event)
    assert data == (
        b"\n[[conditions]]\nn = 7\nt = 2027-03-14T09:00:01.000Z\nseeing_arcsec = 1.5\n"
        b'target = "KR 12"\ncloud_percent = 20.0\ncrc = "%b"\n' % data[-10:-2]
    )


def test_times_stand_under_their_plain_names() -> None:
    """A field ``start_mjd`` is a UTC date-time ``start`` in the file, to the millisecond."""
    _, values = to_values(exposure(2, 1.0))
    assert values["start"] == datetime(2027, 3, 14, 9, 0, tzinfo=UTC)
    assert values["mid"] == datetime(2027, 3, 14, 9, 0, 30, tzinfo=UTC)
    assert not [name for name in values if "mjd" in name]


@pytest.mark.parametrize(
    ("event", "complaint"),
    [
        (Conditions(seeing_arcsec=math.nan), "seeing_arcsec is nan"),
        (Conditions(seeing_arcsec=math.inf), "seeing_arcsec is inf"),
        (Note(text="late", t_mjd=math.nan), "expected a time"),
        (Note(text="x", of=2**63), "64 bits"),
        (Note(text=7), "text is 7"),  # type: ignore[arg-type]
        (Amendment(of=True), "of is True"),
        (Amendment(of=1, extra={"why": "two"}, why="one"), "why is a key"),
        (Amendment(of=1, extra={"credit": math.nan}), "does not read back"),
        (Amendment(of=1, extra={"start": datetime(2027, 1, 1)}), "no time zone"),
    ],
)
def test_what_can_not_be_written_is_refused(event: Event, complaint: str) -> None:
    """Nothing that is not finite, not of its type, or read back differently reaches the disk."""
    t_mjd = event.t_mjd if isinstance(event, Note) and event.text == "late" else at(0)
    with pytest.raises(ValueError, match=complaint):
        encoded(event.stamped(1, t_mjd))


def test_other_zones_are_written_in_utc() -> None:
    """An aware time of another zone is the same moment in the file."""
    local = datetime(2027, 3, 14, 20, 0, tzinfo=timezone(timedelta(hours=11)))
    assert value_text(local) == "2027-03-14T09:00:00.000Z"


SCRAPS = st.sampled_from(
    [
        "a = 1\n", "b = -0\n", "c = 1.5\n", "d = 1e+16\n", "e = -0.0\n", 'f = "x"\n', 'g = "\\t"\n',
        "h = true\n", "i = 2027-03-14T09:00:00.000Z\n", 'j = [1, "a, b", [2.5]]\n', "k = 01\n",
        "l = 2027-13-14T09:00:00.000Z\n", "m = [1\n", "n = 'x'\n", "o = 1_000\n", "p=1\n",
        "q = nan\n", "r = 2027-03-14\n", "# remark\n", "\n", "a = 2\n", 's = "é\t"\n', "t = 1.\n",
        "u = 1e5\n", "v = 9223372036854775808\n", "w = \n", 'x = """y"""\n', "y = 1e+999\n",
    ]
)  # fmt: skip


@settings(max_examples=400, deadline=None)
@given(st.lists(SCRAPS, max_size=6))
def test_the_quick_reader_gives_what_tomllib_gives_or_gives_up(lines: list[str]) -> None:
    """Same keys, same values, same types; anything out of the ordinary is left to tomllib."""
    body = "".join(lines)
    quick = quick_values(body)
    if quick is None:
        return
    plain = tomllib.loads(body)
    assert repr(quick) == repr(plain)
    assert list(map(type, quick.values())) == list(map(type, plain.values()))


def test_the_quick_reader_does_read_whole_nights() -> None:
    """It must not give up on what we write ourselves, or it would serve for nothing."""
    for event in night(20):
        kind, values = to_values(event)
        body = block_bytes(kind, values).decode().split("\n", 2)[2].rsplit("crc", 1)[0]
        assert quick_values(body) == values


def test_unknown_kinds_and_keys_of_later_versions_are_kept_and_said() -> None:
    """Nothing of a later version's log is lost or fatal."""
    values: dict[str, Any] = {"n": 4, "t": datetime(2027, 3, 14, 9, tzinfo=UTC), "spin": [1, 2]}
    foreign = from_values("telemetry", values)
    assert isinstance(foreign, Foreign)
    assert (foreign.n, foreign.kind_in_file, foreign.extra) == (4, "telemetry", {"spin": [1, 2]})
    assert complaints(foreign) == ("unknown kind",)
    assert to_values(foreign) == ("telemetry", values)

    note = from_values("note", {**values, "text": "x"})
    assert isinstance(note, Note)
    assert note.extra == {"spin": [1, 2]}
    assert complaints(note) == ("spin is an unknown key; kept",)
    assert to_values(note)[1] == {**values, "text": "x"}


def test_a_wrong_optional_value_does_not_cost_the_exposure() -> None:
    """It is kept aside and said; a needed one that is wrong makes the whole entry foreign."""
    _, values = to_values(exposure(2, 1.0))
    read = from_values("exposure", {**values, "credit": "much", "airmass_mid": math.nan})
    assert isinstance(read, Exposure)
    assert read.credit is None
    assert read.airmass_mid is None
    assert read.extra["credit"] == "much"
    assert complaints(read) == ("airmass_mid is of the wrong type", "credit is of the wrong type")

    read = from_values("exposure", {**values, "credit": 10**400, "airmass_mid": 1})
    assert isinstance(read, Exposure)
    assert (read.credit, read.airmass_mid) == (None, 1.0)
    read = from_values("exposure", {**values, "filter": 7})
    assert isinstance(read, Foreign)
    assert read.complaint == "filter is of the wrong type"
    read = from_values("exposure", {key: v for key, v in values.items() if key != "filter"})
    assert isinstance(read, Foreign)
    assert read.complaint == "filter is missing"


@pytest.mark.parametrize("n", [0, -3, True, 1.0, "5", None, 10**9 + 1, 10**40])
def test_a_number_that_is_none_is_none(n: object) -> None:
    """Only a whole number from 1 is an entry's number; whatever else stands there is kept."""
    read = from_values("note", {"n": n, "text": "x"})  # type: ignore[dict-item]
    assert isinstance(read, Note)
    assert read.n == 0
    assert math.isnan(read.t_mjd)


def test_every_kind_is_in_the_table_with_number_and_time_first() -> None:
    """The key table is read off the dataclasses: all kinds, and each begins with n and t."""
    assert set(KEYS) == set(KINDS)
    assert len(KINDS) == 17
    for table in KEYS.values():
        assert list(table)[:2] == ["n", "t"]
        assert "crc" not in table
