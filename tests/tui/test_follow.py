"""Looking on at a night from other terminals: within a second, and never a byte written."""

from __future__ import annotations

import json
import time
from pathlib import Path

import pytest

from tests.tui.terminal import Terminal
from tests.tui.test_a_night_in_a_terminal import demo
from tests.tui.trial import a_logbook
from tui.command import main

NIGHT = "2027-03-25"


def test_two_look_on_while_one_observes(tmp_path: Path) -> None:
    """What the observer does is on both other screens within a second; their keys do nothing."""
    folder = a_logbook(tmp_path / "nights")
    path = folder / f"{NIGHT}.toml"
    words = ["follow", "--logbook", str(folder), "--night", NIGHT]
    terminals = [Terminal(demo(folder))]
    try:
        observer = terminals[0]
        observer.wait_for("NEXT")
        terminals += [Terminal(words) for _ in range(2)]
        onlookers = terminals[1:]
        for onlooker in onlookers:
            onlooker.wait_for("NEXT")
            onlooker.wait_for("looking on")
        observer.press(" ")
        observer.wait_for("MOVING TO")
        pressed_s = time.monotonic()
        for onlooker in onlookers:
            onlooker.wait_for("MOVING TO", 10.0)
        assert time.monotonic() - pressed_s < 3.0

        observer.read(0.5)
        before = path.read_bytes()
        names = sorted(each.name for each in folder.iterdir())
        for onlooker in onlookers:
            onlooker.press(" ")
            onlooker.wait_for("this console looks on")
            onlooker.press("u")
            onlooker.press("n")
            onlooker.wait_for("note:")
            onlooker.press("not mine\r")
            onlooker.read(0.5)
            onlooker.press("q")
            assert onlooker.wait() == 0
        assert path.read_bytes() == before
        assert sorted(each.name for each in folder.iterdir()) == names
    finally:
        for terminal in terminals:
            terminal.close()


def test_follow_as_json_and_without_a_night(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """JSON says where a night stands; of a night without a log it says so, status 1."""
    folder = a_logbook(tmp_path / "nights")
    words = ["follow", "--json", "--logbook", str(folder), "--night"]
    assert main([*words, NIGHT]) == 1
    assert "nobody has opened this night" in capsys.readouterr().err
    terminal = Terminal(demo(folder))
    try:
        terminal.wait_for("NEXT")
        terminal.wait_for("log on disk")
    finally:
        terminal.kill()
    assert main([*words, NIGHT]) == 0
    told = json.loads(capsys.readouterr().out)
    assert told["night"] == NIGHT
    assert told["entries"] >= 1
    assert told["closed"] is False
