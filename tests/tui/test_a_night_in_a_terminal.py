"""A night through the real program in a real terminal, with a kill -9 in the middle of it."""

from __future__ import annotations

import re
import signal
import tomllib
import zlib
from pathlib import Path
from typing import Any

import pytest

from tests.tui.terminal import Terminal
from tests.tui.trial import a_logbook

# At sixty times the pace an exposure of the trial logbook is over in a moment.
PACE = "60"


def demo(folder: Path) -> list[str]:
    """Return the words that open the rehearsed night for driving by hand."""
    return ["demo", "--drive", "--pace", PACE, "--into", str(folder)]


def next_target(text: str) -> str:
    """Return what the screen proposes next."""
    found = re.search(r"NEXT +(\S+(?: \S+)?)", text)
    assert found is not None, text
    return found[1]


def events_of(path: Path) -> list[dict[str, Any]]:
    """Return every event of a log in order of n, through plain tomllib, each with its kind."""
    tables = tomllib.loads(path.read_text(encoding="utf-8"))
    blocks = [
        {"kind": kind, **block}
        for kind, entries in tables.items()
        if isinstance(entries, list)
        for block in entries
        if "n" in block
    ]
    return sorted(blocks, key=lambda block: block["n"])


def test_a_night_survives_kill_9(tmp_path: Path) -> None:
    """Run two filters, enter a worse seeing, die in an exposure, come back, and read the log."""
    folder = a_logbook(tmp_path / "nights")

    terminal = Terminal(demo(folder))
    try:
        # Another target than the proposed one is found by name and chosen; then a key a step.
        screen = terminal.wait_for("NEXT")
        assert next_target(screen).startswith("Sharp Two"), screen
        terminal.press("/")
        terminal.wait_for("show targets with")
        terminal.press("one\r")
        terminal.wait_for(lambda text: "Blunt  " not in text.partition("HA")[2])
        terminal.press("\r")
        terminal.wait_for("MOVING TO  Sharp One")
        terminal.press("\x1b")
        terminal.press(" ")
        terminal.wait_for("ON TARGET  Sharp One")
        terminal.wait_for(lambda text: "start B 30s×2" in text and "V 20s×2" in text)
        terminal.press(" ")
        terminal.wait_for("EXPOSING")
        screen = terminal.wait_for("its plan is finished")
        assert re.search(r"Sharp One .*B●● V●●", screen), screen
        proposed = next_target(screen)
        assert proposed.startswith("Sharp Two"), screen

        # A worse seeing: the sizes and the order change at once, and the screen says why.
        terminal.press("z")
        terminal.wait_for("seeing at the zenith")
        terminal.press("much\r")
        terminal.wait_for("expected 0.1 to 20 arcsec")
        terminal.press("\x7f" * 4 + "4.5\r")
        terminal.wait_for(
            lambda text: (
                "too soft now: Sharp Two" in text and "next Blunt instead of Sharp Two" in text
            )
        )
        assert next_target(terminal.text()).startswith("Blunt")

        # Off to the other one, and dead in its first exposure.
        terminal.press(" ")
        terminal.wait_for("MOVING TO  Blunt")
        terminal.press(" ")
        terminal.wait_for("ON TARGET  Blunt")
        terminal.press(" ")
        terminal.wait_for(lambda text: "EXPOSING" in text and "1 of 3" in text)
        terminal.wait_for("log on disk")
    finally:
        terminal.kill()

    # The same night again: everything is there, and the observer decides about the exposure.
    terminal = Terminal(demo(folder))
    try:
        screen = terminal.wait_for("CUT OFF  R 900 s on Blunt")
        assert re.search(r"Sharp One .*B●● V●●", screen), screen
        assert "R○○○" in screen
        terminal.press("L")
        terminal.wait_for("ON TARGET  Blunt")
        terminal.wait_for("log on disk")
        terminal.press("q")
        assert terminal.wait() == 0
    finally:
        terminal.close()

    path = folder / "2027-03-25.toml"
    events = events_of(path)
    assert [event["n"] for event in events] == list(range(1, len(events) + 1))
    check_crcs(path.read_bytes())
    told = [
        (e["kind"], e["target"], e["filter"], e["outcome"])
        for e in events
        if e["kind"] == "exposure"
    ]
    assert told == [
        *[("exposure", "Sharp One", "B", "good")] * 2,
        *[("exposure", "Sharp One", "V", "good")] * 2,
        ("exposure", "Blunt", "R", "cut_off"),
    ]
    assert [e["seeing_arcsec"] for e in events if e["kind"] == "conditions"] == [4.5]
    pointed = [(e["target"], e.get("on_target", False)) for e in events if e["kind"] == "pointing"]
    assert pointed == [
        ("Sharp One", False), ("Sharp One", True), ("Blunt", False), ("Blunt", True),
    ]  # fmt: skip
    overrides = [(e["target"], e["instead_of"]) for e in events if e["kind"] == "override"]
    assert overrides == [("Sharp One", "Sharp Two")]
    assert sum(e["kind"] == "run_start" for e in events) == 2
    assert [e["why"] for e in events if e["kind"] == "run_stop"] == ["finished", "cut off"]
    assert events[-1]["kind"] == "close"


def check_crcs(data: bytes) -> None:
    """Check every block's own sum, counted here and not by the program's code."""
    blocks = re.findall(rb'(\[\[\w+\]\]\nn = .*?)crc = "([0-9a-f]{8})"\n', data, re.DOTALL)
    assert len(blocks) == data.count(b"\nn = ")
    for body, crc in blocks:
        assert f"{zlib.crc32(body):08x}".encode() == crc


@pytest.mark.parametrize(
    ("number", "status"),
    [(signal.SIGHUP, 129), (signal.SIGINT, 130), (signal.SIGTERM, 143)],
    ids=lambda value: getattr(value, "name", ""),
)
def test_a_signal_ends_it_cleanly(tmp_path: Path, number: signal.Signals, status: int) -> None:
    """Told to end in mid-exposure, it closes the log and ends; the night can be taken up again."""
    folder = a_logbook(tmp_path / "nights")
    terminal = Terminal(demo(folder))
    try:
        terminal.wait_for("NEXT")
        for wanted in ("MOVING TO", "ON TARGET", "EXPOSING"):
            terminal.press(" ")
            terminal.wait_for(wanted)
        terminal.child.send_signal(number)
        assert terminal.wait() == status
    finally:
        terminal.close()
    events = events_of(folder / "2027-03-25.toml")
    assert events[-1]["kind"] == "close"
    assert number.name in events[-1]["why"]

    terminal = Terminal(demo(folder))
    try:
        terminal.wait_for("CUT OFF")
    finally:
        terminal.kill()


def test_a_terminal_that_is_gone_is_left(tmp_path: Path) -> None:
    """When the terminal hangs up, as a dropped ssh does, the log is closed; the night goes on."""
    folder = a_logbook(tmp_path / "nights")
    terminal = Terminal(demo(folder))
    terminal.wait_for("NEXT")
    for wanted in ("MOVING TO", "ON TARGET", "EXPOSING"):
        terminal.press(" ")
        terminal.wait_for(wanted)
    terminal.hang_up()
    assert terminal.child.wait(20) == 129
    assert events_of(folder / "2027-03-25.toml")[-1]["kind"] == "close"

    terminal = Terminal(demo(folder))
    try:
        terminal.wait_for("CUT OFF")
        terminal.press("K")
        terminal.wait_for(lambda text: "EXPOSING" in text or "STARTS IN" in text)
    finally:
        terminal.kill()
