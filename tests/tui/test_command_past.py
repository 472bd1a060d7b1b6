"""``warmroom past``: its pages, its JSON, its exit status."""

from __future__ import annotations

import json
import shutil
from pathlib import Path
from typing import Any

import pytest

from engine.log import Note
from engine.logbook import sample_logbook
from tests.engine.log_nights import blocks_of
from tests.engine.past_logs import folded
from tui.command import main
from tui.commands.past import show_progress


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a copy of the sample logbook with a log of nonsense and a torn one."""
    folder = tmp_path / "nights"
    shutil.copytree(sample_logbook(), folder)
    (folder / "2027-03-01.toml").write_text("nothing of ours\n")
    torn = (folder / "2027-03-12.toml").read_bytes()
    note = Note(n=90_000, t_mjd=61477.0, text="thin cirrus \x1b[31m in the west", target="M 83")
    (folder / "2027-03-12.toml").write_bytes(torn + blocks_of([note]) + b"\n[[note]]\nn = 9")
    return folder


def run_json(capsys: pytest.CaptureFixture[str], *words: str) -> tuple[int, Any]:
    """Run ``past`` with --json; return its status and what it printed."""
    status = main(["past", *words, "--json"])
    return status, json.loads(capsys.readouterr().out)


def test_the_whole_page(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Nights, where their time went, what remains, seeing; bad logs by name, counted apart."""
    assert main(["past", "--logbook", str(folder)]) == 0
    page = capsys.readouterr().out
    assert "3 night logs: 1 sound, 1 half written, 1 unreadable" in page
    assert "2027-03-01.toml: unreadable: this is no night log" in page
    assert "2027-03-12.toml: half written: " in page
    assert "dark hours in 2 nights; shutter open" in page
    assert "of what the list asks, over all nights" in page
    assert "seeing (zenith, 500 nm): 86 values of 2 nights" in page


def test_json_of_the_whole(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The counts are those of the fold; times are ISO, hours add up."""
    status, told = run_json(capsys, "--logbook", str(folder))
    assert status == 0
    states = folded(folder)
    assert [n["exposures"] if "exposures" in n else sum(n["counts"].values())
            for n in told["nights"] if n["state"] != "unreadable"] == [
        len(state.exposures) for state in states.values()
    ]  # fmt: skip
    assert sum(each["count"] for each in told["totals"] if each["outcome"] == "good") == sum(
        len(state.kept) for state in states.values()
    )
    assert all(each["first"].endswith("Z") for each in told["totals"])
    time = told["time"]
    assert sum(time["spent_h"].values()) == pytest.approx(time["dark_h"])
    assert told["seeing"]["all"]["count"] == sum(told["seeing"]["counts"])


def test_pages_by_option(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Each option answers its question, or says no with status 1."""
    where = ("--logbook", str(folder))
    status, told = run_json(capsys, *where, "--target", "M 83")
    assert status == 0
    assert {each["target"] for each in told["exposures"]} == {"M 83"}
    assert [e["start"] for e in told["exposures"]] == sorted(e["start"] for e in told["exposures"])
    status, told = run_json(capsys, *where, "--find", "cirr west")
    assert (status, len(told["found"])) == (0, 1)
    status, told = run_json(capsys, *where, "--where", "airmass<1.05", "--where", "fwhm<1.1")
    assert status == 0
    assert all(e["airmass_mid"] < 1.05 and e["measured_fwhm_arcsec"] < 1.1 for e in told["found"])
    status, told = run_json(capsys, *where, "--refused")
    assert status == 0
    assert {each["outcome"] for each in told["newest"]} == {"rejected", "stopped"}
    status, told = run_json(capsys, *where, "--seeing", "--since", "2027-03-11")
    assert (status, told["nights"]) == (0, 1)
    status, told = run_json(capsys, *where, "--fit")
    assert status == 1
    assert told["missing"]


def test_what_notes_hold_is_never_obeyed_by_the_terminal(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """Escapes from a log are shown, not sent."""
    assert main(["past", "--logbook", str(folder), "--find", "cirrus"]) == 0
    page = capsys.readouterr().out
    assert "thin cirrus" in page
    assert "\x1b" not in page


@pytest.mark.parametrize(
    ("words", "status"),
    [
        (("--target", "no such star"), 1),
        (("--find", "never written"), 1),
        (("--where", "airmass<0.5"), 1),
        (("--since", "2031-01-01"), 1),
        (("--where", "colour<3"), 2),
    ],
)
def test_exit_status(
    folder: Path, capsys: pytest.CaptureFixture[str], words: tuple[str, ...], status: int
) -> None:
    """1 when the answer is no, 2 for what can't be asked."""
    assert main(["past", "--logbook", str(folder), *words]) == status
    assert main(["past", "--logbook", str(folder / "nowhere")]) == 2
    capsys.readouterr()


def test_what_is_found_is_all_there_is(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """However many: who counts them for a paper gets no round number."""
    exposures = [each for state in folded(folder).values() for each in state.exposures]
    high = [each for each in exposures if each.airmass_mid is not None and each.airmass_mid < 2.0]
    assert len(high) > 200
    _, told = run_json(capsys, "--logbook", str(folder), "--where", "airmass<2")
    assert len(told["found"]) == len(high)


def test_what_was_refused_is_of_the_period_asked_for(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """The reasons and the frames are of the same nights."""
    _, whole = run_json(capsys, "--logbook", str(folder), "--refused")
    words = ("--refused", "--until", "2027-03-10")
    _, told = run_json(capsys, "--logbook", str(folder), *words)
    counted = [sum(each["count"] for each in page["refused"]) for page in (told, whole)]
    assert counted == [len(page["newest"]) for page in (told, whole)]
    assert 0 < counted[0] < counted[1]


def test_long_work_shows_a_bar(capsys: pytest.CaptureFixture[str]) -> None:
    """Short work shows none; long work one that grows, on the error stream, and ends its line."""
    show_progress(3, 5)
    assert capsys.readouterr().err == ""
    for done in (0, 150, 300):
        show_progress(done, 300)
    told = capsys.readouterr()
    assert told.out == ""
    assert [part.count("█") for part in told.err.split("\r")[1:]] == [0, 15, 30]
    assert told.err.endswith("300 of 300\n")
