"""First use: six questions on a plain terminal."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import pytest

from engine.logbook import load_logbook
from tui.first_use import offer_logbook


def answers(monkeypatch: pytest.MonkeyPatch, lines: list[str]) -> None:
    """Let these lines be typed, and then ctrl+d."""
    typed: Iterator[str] = iter(lines)

    def next_line(_: str) -> str:
        try:
            return next(typed)
        except StopIteration:
            raise EOFError from None

    monkeypatch.setattr("builtins.input", next_line)


def test_six_answers_make_a_logbook(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """A wrong one is asked again, by itself."""
    answers(monkeypatch, ["Here, -31.27, 149", "", "", "nine, 1, 1", "9, 1024, 1024", "V", ""])
    assert offer_logbook(tmp_path / "nights")
    assert "the pixel is 'nine'" in capsys.readouterr().out
    logbook = load_logbook(tmp_path / "nights")
    assert logbook.observatory.site.name == "Here"
    assert logbook.observatory.camera.columns == 1024


def test_what_does_not_fit_together_is_asked_again(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """All six, with what was typed."""
    answers(monkeypatch, ["Here, -31.27, -60", *[""] * 5, "Here, -31.27, 149", *[""] * 5])
    assert offer_logbook(tmp_path / "nights")
    assert "do not fit" in capsys.readouterr().out


def test_leaving_in_the_middle_writes_nothing(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    """Nor makes a folder."""
    answers(monkeypatch, ["", ""])
    assert not offer_logbook(tmp_path / "nights")
    assert not (tmp_path / "nights").exists()
    assert "Nothing was written" in capsys.readouterr().out
