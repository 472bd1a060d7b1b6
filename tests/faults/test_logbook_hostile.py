"""Whatever stands in a logbook's folder: an answer, or faults in a line each, and soon.

Time is counted as this process's own, so that a busy machine does not matter.
"""

from __future__ import annotations

import os
import random
import socket
import time
import unicodedata
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import Any, NoReturn

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from engine.errors import Fault, LogbookFaults
from engine.logbook import Logbook, load_logbook, sample_logbook
from engine.logbook.files import LARGEST_BYTES
from tests.engine.logbook_files import OBSERVATORY, TARGETS, as_told, written

LONGEST_S = 4.0  # twice what the slowest of them takes here
ONE = """\
[[target]]
name = "A"
ra = 1
dec = 2
exposures = [{filter = "V", seconds = 1, count = 1}]
"""
CSV = "name,programme,ra,dec,exposures\nA,Clusters,1,2,V:60x5 B:60x5\nB,Clusters,1,2,V:60x5\n"
ECSV = (
    "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: name, datatype: string}\n"
    "# - {name: ra, unit: deg, datatype: float64}\n"
    "# - {name: dec, unit: deg, datatype: float64}\n"
    "# - {name: exposures, datatype: string}\n# schema: astropy-2.0\n"
    'name ra dec exposures\nA 5.5 2 "V:60x5 B:60x5"\nB 5.5 2 V:60x5\n'
)
VOT = """\
<?xml version="1.0"?>
<VOTABLE version="1.3" xmlns="http://www.ivoa.net/xml/VOTable/v1.3"><RESOURCE><TABLE>
<FIELD name="name" datatype="char" arraysize="*"/>
<FIELD name="ra" datatype="double" unit="deg"/>
<FIELD name="dec" datatype="double" unit="deg"/>
<FIELD name="exposures" datatype="char" arraysize="*"/>
<DATA><TABLEDATA>
<TR><TD>A</TD><TD>1.5</TD><TD>2.5</TD><TD>V:60x5</TD></TR>
<TR><TD>B</TD><TD>1.5</TD><TD>2.5</TD><TD>V:60x5</TD></TR>
</TABLEDATA></DATA></TABLE></RESOURCE></VOTABLE>
"""
HEAD_OF_VOT = VOT.split("<DATA>")[0]
FOOT_OF_VOT = "</DATA></TABLE></RESOURCE></VOTABLE>"


@pytest.fixture(autouse=True)
def _no_network(monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> NoReturn:
        pytest.fail("a connection was tried")

    monkeypatch.setattr(socket.socket, "connect", refuse)
    monkeypatch.setattr(socket, "getaddrinfo", refuse)


def read(folder: Path) -> Logbook | LogbookFaults:
    """Return the logbook or its faults, having checked that they can be shown as they are."""
    begun_s = time.process_time()
    answer: Logbook | LogbookFaults
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        try:
            answer = load_logbook(folder)
        except LogbookFaults as found:
            answer = found
    assert time.process_time() - begun_s < LONGEST_S
    if isinstance(answer, LogbookFaults):
        assert answer.faults
        for fault in answer.faults:
            check(fault, folder)
    return answer


def check(fault: Fault, folder: Path) -> None:
    """Check that a fault is a line that can be shown, about a line of a file in the folder."""
    assert fault.path.is_relative_to(folder)
    lines = 1
    if fault.path.is_file():
        with open(fault.path, "rb") as file:
            lines += file.read().count(b"\n")
    assert 1 <= fault.line <= lines
    assert len(str(fault)) < 1000
    assert not {"Cc", "Cf", "Zl", "Zp"} & {unicodedata.category(each) for each in str(fault)}
    assert "expected" in fault.what


def told(folder: Path) -> list[str]:
    """Return the lines told of a folder that holds faults, with the folder cut off."""
    answer = read(folder)
    assert isinstance(answer, LogbookFaults)
    return as_told(folder, str(answer))


def a_folder(path: Path) -> None:
    """Make a folder where a file should be."""
    path.mkdir()


def a_pipe(path: Path) -> None:
    """Make a pipe into which nobody writes."""
    os.mkfifo(path)


def a_loop(path: Path) -> None:
    """Make a link to itself."""
    path.symlink_to(path)


def a_dead_link(path: Path) -> None:
    """Make a link to nowhere."""
    path.symlink_to(path.with_name("nowhere"))


@pytest.mark.parametrize(
    ("make", "what"),
    [
        (a_folder, "a folder, expected a file"),
        (a_pipe, "no plain file, expected a file"),
        (a_loop, "too many levels of symbolic links, expected a file that can be read"),
        (a_dead_link, "is missing, expected a file"),
    ],
)
@pytest.mark.parametrize("name", ["observatory.toml", "targets.toml", "targets/more.csv"])
def test_no_file_where_one_should_be(
    make: Callable[[Path], None], what: str, name: str, tmp_path: Path
) -> None:
    """Each kind of thing that is no file is told, and never waited for."""
    path = written(tmp_path) / name
    path.parent.mkdir(exist_ok=True)
    path.unlink(missing_ok=True)
    make(path)
    assert told(tmp_path) == [f"{name}:1: {what}"]


def test_nothing_there(tmp_path: Path) -> None:
    """Both files are told to be missing, of an empty folder and of one that is not there."""
    missing = "1: is missing, expected a file"
    lines = [f"observatory.toml:{missing}", f"targets.toml:{missing}"]
    assert told(tmp_path) == lines
    assert told(tmp_path / "none") == lines
    with pytest.raises(LogbookFaults, match="ile name too long, expected a file"):
        load_logbook(tmp_path / ("n" * 5000))


def test_a_file_that_may_not_be_read(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """The system's reason is told."""
    written(tmp_path)
    open_as_ever = Path.open

    def refuse(path: Path, *rest: Any, **more: Any) -> Any:
        if path.name == "targets.toml":
            raise PermissionError(13, "Permission denied")
        return open_as_ever(path, *rest, **more)

    monkeypatch.setattr(Path, "open", refuse)
    assert told(tmp_path) == ["targets.toml:1: permission denied, expected a file that can be read"]


@pytest.mark.parametrize(
    ("content", "line", "what"),
    [
        (b"", 1, "is empty, expected a file with something in it"),
        (b" \n\n", 1, "is empty, expected a file with something in it"),
        (b"# nothing\n", 1, "no target, expected at least one [[target]]"),
        (TARGETS.encode("utf-16"), 1, "not UTF-8, expected a text file in UTF-8"),
        (TARGETS.encode() + b"\n# caf\xe9", 25, "not UTF-8, expected a text file in UTF-8"),
        (TARGETS.encode() + b"#\0", 24, "a NUL character, expected text"),
        (b"x" * 10_000_000, 1, f"is too large, expected at most {LARGEST_BYTES} bytes"),
        (b"\n\na = " + b"[" * 100_000, 3, "nested too deep, expected at most 50 levels"),
        (b"\na = " + b"{a=" * 100_000, 2, "nested too deep, expected at most 50 levels"),
        (b"\n" + b"a." * 400_000 + b"a=1", 2, "nested too deep, expected at most 50 levels"),
        (b"\n[" + b'"a" . ' * 150_000 + b"a]", 2, "nested too deep, expected at most 50 levels"),
        (b"\na = " + b"9" * 5000, 2, "a number of thousands of digits, expected a short one"),
    ],
)
def test_no_such_list_of_targets(content: bytes, line: int, what: str, tmp_path: Path) -> None:
    """One line for a file that is not what it should be."""
    written(tmp_path, {"targets.toml": content})
    assert told(tmp_path) == [f"targets.toml:{line}: {what}"]


@pytest.mark.parametrize(("opening", "closing"), [("[", "]"), ("{a=", "}")])
def test_any_depth(opening: str, closing: str, tmp_path: Path) -> None:
    """A value nested a little is wrong; nested more, past what the parser bears, too deep."""
    for depth in (10, 60, *range(200, 600, 3)):
        value = f"{opening * depth}{'1' if closing == '}' else ''}{closing * depth}"
        written(tmp_path, {"targets.toml": ONE.replace("ra = 1", f"ra = {value}")})
        (line,) = told(tmp_path)
        deep = "targets.toml:3: nested too deep, expected at most 50 levels"
        assert line.startswith("targets.toml:3: target['A'].ra: " if depth == 10 else deep)


@pytest.mark.parametrize("mark", [b"", b"\xef\xbb\xbf"])
@pytest.mark.parametrize("ends", [b"\n", b"\r\n"])
def test_what_other_systems_write_is_read(mark: bytes, ends: bytes, tmp_path: Path) -> None:
    """A byte order mark and other line ends change nothing, nor the line of a fault."""
    files: dict[str, str | bytes] = {
        name: mark + text.encode().replace(b"\n", ends)
        for name, text in (("observatory.toml", OBSERVATORY), ("targets.toml", TARGETS))
    }
    plain = written(tmp_path / "plain")
    odd = written(tmp_path / "odd", files)
    assert load_logbook(odd).targets == load_logbook(plain).targets
    assert load_logbook(odd).observatory == load_logbook(plain).observatory
    written(odd, {"targets.toml": (mark + TARGETS.replace("11.0", "x").encode())})
    assert told(odd)[0].startswith("targets.toml:10: ")


MUCH = {
    "empty tables": "[[target]]\n" * 90_000,
    "unknown keys": ONE + "".join(f"k{number} = 1\n" for number in range(90_000)),
    "a long key": ONE + "k" * 900_000 + " = 1",
    "a long list": "a = [" + "1," * 450_000 + "]",
    "windows": ONE + "windows = [" + "[1,2]," * 150_000 + "]",
    "filters": ONE.replace("[{", "[" + '{filter = "Q", seconds = 1, count = 1},' * 20_000 + "{"),
    "one name": ONE * 10_000,
    "a huge number": ONE.replace("ra = 1", "ra = 0x" + "f" * 900_000),
}


@pytest.mark.parametrize("kind", MUCH)
def test_much_of_something(kind: str, tmp_path: Path) -> None:
    """A megabyte of faults is told in part, and soon."""
    assert 1 <= len(told(written(tmp_path, {"targets.toml": MUCH[kind]}))) <= 201


TABLES = {
    "elsewhere": (
        HEAD_OF_VOT + '<DATA><BINARY><STREAM href="http://a.example/b"/></BINARY>' + FOOT_OF_VOT,
        "7: fetches its rows from elsewhere, expected them in this file",
    ),
    "another file": (
        HEAD_OF_VOT
        + '<DATA><BINARY><STREAM encoding="base64" href="file:///etc/hostname"/></BINARY>'
        + FOOT_OF_VOT,
        "7: fetches its rows from elsewhere, expected them in this file",
    ),
    "FITS": (
        HEAD_OF_VOT + '<DATA><FITS><STREAM href="x"/></FITS>' + FOOT_OF_VOT,
        "7: holds a FITS file, expected TABLEDATA",
    ),
    "entities": (
        VOT.replace("<VOTABLE", '<!DOCTYPE a [<!ENTITY b SYSTEM "file:///etc/hostname">]><VOTABLE'),
        "2: a DOCTYPE, expected a VOTable without one",
    ),
    "rows that are not there": (
        VOT.replace("<TABLE>", '<TABLE nrows="99999999999">'),
        "2: too large a table, expected a list of targets",
    ),
    "wide cells": (
        VOT.replace('arraysize="*"', 'arraysize="99999x99999"'),
        "2: too large a table, expected a list of targets",
    ),
    "two tables": (
        VOT.replace("</TABLE>", "</TABLE>\n<TABLE/>"),
        "11: a second TABLE, expected one",
    ),
    "no XML": ("hello", "1: syntax error, expected a VOTable in XML"),
    "cut": (VOT[:450], "10: unclosed token, expected a VOTable in XML"),
    "a page": ("<html><body/></html>", "1: no TABLE, expected a VOTable with one"),
    "tags": ("<a>" * 300_000, "1: no element found, expected a VOTable in XML"),
}


@pytest.mark.parametrize("kind", TABLES)
def test_a_votable_not_to_be_read(kind: str, tmp_path: Path) -> None:
    """One line, before astropy sees it: nothing is fetched, no room is made."""
    text, line = TABLES[kind]
    assert told(written(tmp_path, {"targets.vot": text})) == [f"targets.vot:{line}"]


@pytest.mark.parametrize(
    ("name", "text"),
    [
        ("targets.csv", "," * 900_000),
        ("targets.csv", "name,ra,dec,exposures\n" + "A" * 900_000),
        ("targets.csv", "name,ra,dec,exposures\n" + "A,1,2,V:1x1\n" * 70_000),
        ("targets.csv", "name\n"),
        ("targets.ecsv", "hello\n"),
        ("targets.ecsv", ECSV.replace("# ---\n", "# ---\n" + "# a: 1\n" * 100_000)),
        ("targets.ecsv", ECSV.replace("# ---", "# --- &a [*a, !!python/object:os.system x]")),
        ("targets.vot", HEAD_OF_VOT + "<DATA><TABLEDATA>" + "<TR/>\n" * 100_000 + FOOT_OF_VOT),
        ("targets.vot", VOT.replace("<TABLE>", "<RESOURCE>" * 30_000 + "<TABLE>")),
    ],
)
def test_a_table_that_is_none(name: str, text: str, tmp_path: Path) -> None:
    """Told in a line or in a few hundred, and soon."""
    assert 1 <= len(told(written(tmp_path, {name: text}))) <= 201


def test_nothing_is_half_read(tmp_path: Path) -> None:
    """One faulty row among sound ones, and there is no logbook."""
    written(tmp_path, {"targets.csv": CSV})
    assert len(load_logbook(tmp_path).targets) == 4
    written(tmp_path, {"targets.csv": CSV.replace("B,Clusters,1,2", "B,Clusters,1,92")})
    assert len(told(tmp_path)) == 1


def sample_text(name: str) -> bytes:
    """Return one file of the sample logbook."""
    return (sample_logbook() / name).read_bytes()


SOUND: dict[str, bytes] = {
    "observatory.toml": OBSERVATORY.encode(),
    "targets.toml": TARGETS.encode(),
    "targets.csv": CSV.encode(),
    "targets.ecsv": ECSV.encode(),
    "targets.vot": VOT.encode(),
}
# Pieces that mean something in one of the forms, and some that mean nothing in any.
PIECES = [
    b"", b"[", b"]", b"[[", b"{", b"}", b"=", b'"', b'"""', b"'", b"\n", b"\r", b",", b".", b"#",
    b"-", b"nan", b"inf", b"1e999", b"9" * 30, b"0x", b"\\u0000", b"\\", b"\x00", b"\x1b", b"\xff",
    b"\xe2\x80\xae", b"2027-03-25T11:00:00Z", b"[[target]]\n", b"[site]\n", b"<", b">", b"&", b"/",
    b"<TR>", b"</TD>", b"<![CDATA[", b"--", b"x", b":", b" ", b"true", b"[[]]", b"{}",
]  # fmt: skip


@st.composite
def damaged(draw: st.DrawFn) -> tuple[str, bytes]:
    """Draw one file of the logbook with a few places cut out, doubled, or overwritten."""
    name = draw(st.sampled_from(sorted(SOUND)))
    raw = SOUND[name]
    for _ in range(draw(st.integers(1, 4))):
        begin = draw(st.integers(0, len(raw)))
        end = min(len(raw), begin + draw(st.integers(0, 12)))
        piece = draw(st.sampled_from(PIECES) | st.binary(max_size=4) | st.just(raw[begin:end] * 2))
        raw = raw[:begin] + piece + raw[end:]
    return name, raw


@settings(
    max_examples=300,
    derandomize=True,
    deadline=None,
    suppress_health_check=[HealthCheck.function_scoped_fixture],
)
@given(damage=damaged())
def test_any_damage_is_told_or_harmless(damage: tuple[str, bytes], tmp_path: Path) -> None:
    """A few bytes changed anywhere: a logbook, or faults that can be shown; nothing else."""
    name, raw = damage
    folder = written(tmp_path)
    for other in SOUND:
        if other.startswith("targets.") and other != "targets.toml":
            (folder / other).unlink(missing_ok=True)
    written(folder, {name: raw} | ({} if name.endswith("toml") else {"targets.toml": b"#"}))
    read(folder)


@pytest.mark.parametrize("name", ["observatory.toml", "targets.toml"])
def test_the_sample_with_bytes_changed(name: str, tmp_path: Path) -> None:
    """Two hundred changes to the sample's own files, each read like any other file."""
    both = {each: sample_text(each) for each in ("observatory.toml", "targets.toml")}
    chance = random.Random(20270325)
    outcomes = set()
    for _ in range(200):
        raw = bytearray(both[name])
        for _ in range(chance.randint(1, 3)):
            raw[chance.randrange(len(raw))] = chance.choice(b'"[]{}=.,\n#x5 -\xff')
        outcomes.add(type(read(written(tmp_path, {**both, name: bytes(raw)}))))
    assert outcomes == {Logbook, LogbookFaults}
