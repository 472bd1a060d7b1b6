"""Stories of past nights in the console, over the sample's own logs and a few that are not well."""

from __future__ import annotations

import asyncio
import csv
import shutil
from pathlib import Path

import pytest

from engine.clock import HandClock
from engine.log import fold, read_log
from engine.logbook import sample_logbook
from tests.tui.trial import Trial, after_dusk_mjd, play
from tui.console.views.past_pages import window
from tui.paint.past import Quartiles, histogram, seeing_picture, time_picture
from tui.paint.spans import width_of

SIZES = [(80, 24), (160, 50)]


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a copy of the sample logbook, with a log that is none."""
    folder = tmp_path / "nights"
    shutil.copytree(sample_logbook(), folder)
    (folder / "2027-03-02.toml").write_text("not a log\n")
    return folder


async def opened(trial: Trial) -> None:
    """Show the view and wait until past nights are read."""
    await trial.press("7")
    for _ in range(200):
        await trial.pilot.pause()
        trial.console.paint()
        if "reading" not in trial.text("view"):
            return
        await asyncio.sleep(0.02)
    raise AssertionError("past nights were never read")


def tell(folder: Path, story: object, size: tuple[int, int] = (160, 50)) -> None:
    """Play a story over a folder."""
    play(folder, story, size=size, clock=HandClock(after_dusk_mjd(folder)))  # type: ignore[arg-type]


@pytest.mark.parametrize("size", SIZES)
def test_nights_stand_with_their_pictures(folder: Path, size: tuple[int, int]) -> None:
    """The newest first, tonight not among them, and what is no log said to be none."""

    async def story(trial: Trial) -> None:
        await opened(trial)
        rows = trial.text("view").splitlines()
        assert " 3 nights, shutter open 84% of the dark  1 unreadable" in rows[1]
        assert [row[2:12] for row in rows[3:6]] == ["2027-03-12", "2027-03-10", "2027-03-02"]
        assert "━━" in rows[3]
        assert "●" in rows[3]
        assert "273/282" in rows[3]
        assert "unreadable" in rows[5]

    tell(folder, story, size)


@pytest.mark.parametrize("size", SIZES)
def test_a_night_is_played_again(folder: Path, size: tuple[int, int]) -> None:
    """At each entry the state is the fold up to it; the last one is the night as it ended."""
    events = read_log(folder / "2027-03-12.toml").events

    async def story(trial: Trial) -> None:
        await opened(trial)
        await trial.press("enter")
        assert f"  entry 1 of {len(events)}" in trial.text("view")
        await trial.press(*["pagedown"] * 7)
        at = next(row for row in trial.text("view").splitlines() if row.startswith("▶"))
        n = int(at[11:15])
        state = fold(events[:n])
        assert f"{len(state.kept)} kept of {len(state.exposures)}" in trial.text("view")
        await trial.press("G")
        whole = fold(events)
        assert f"{len(whole.kept)} kept of {len(whole.exposures)}" in trial.text("view")
        await trial.press("escape")
        assert "▶ 2027-03-12" in trial.text("view")

    tell(folder, story, size)


def test_a_targets_history_follows_the_cursor_of_the_list(folder: Path) -> None:
    """Every exposure of it, whatever became of it; enter goes to where it was taken."""
    state = fold(read_log(folder / "2027-03-10.toml").events)
    taken = [each for each in state.exposures if each.target == "NGC 3621"]

    async def story(trial: Trial) -> None:
        await opened(trial)
        await trial.press("tab")
        trial.console.choose("NGC 3621")
        await trial.press("j", "k")
        kept = sum(each.outcome == "good" for each in taken)
        assert f"NGC 3621  {kept} kept of {len(taken)} in 1 night" in trial.text("view")
        await trial.press("G", "enter")
        assert "▶ " in trial.text("view")
        assert f" {taken[0].n:>4}  " in next(
            row for row in trial.text("view").splitlines() if row.startswith("▶")
        )
        await trial.press("escape", "right")
        assert trial.console.chosen != "NGC 3621"

    tell(folder, story)


@pytest.mark.parametrize("size", SIZES)
def test_seeing_and_search(folder: Path, size: tuple[int, int]) -> None:
    """The site's seeing in pictures; words found; nothing found said so."""

    async def story(trial: Trial) -> None:
        await opened(trial)
        await trial.press("tab", "tab")
        assert "seeing of 2 nights  86 values, 86 from images" in trial.text("view")
        assert "March" in trial.text("view")
        await trial.press("slash")
        await trial.type("trailed")
        assert "10 found with trailed" in trial.text("view")
        await trial.press("slash")
        await trial.type("zebra")
        assert "0 found with zebra" in trial.text("view")
        await trial.press("escape")
        assert " 3 nights" in trial.text("view")

    tell(folder, story, size)


def test_what_is_shown_can_be_exported(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """A list as CSV where the observer says; never over a file that is there."""
    monkeypatch.chdir(tmp_path)

    async def story(trial: Trial) -> None:
        await opened(trial)
        await trial.press("tab")
        trial.console.choose("NGC 3621")
        await trial.press("e")
        await trial.type("out.csv")
        assert "15 rows in out.csv" in trial.text("notices")
        await trial.press("e")
        await trial.type("out.csv")
        assert "is there already" in trial.text("notices") + trial.text("entry")

    tell(folder, story)
    with (tmp_path / "out.csv").open(encoding="utf-8") as file:
        rows = list(csv.DictReader(file))
    exposures = fold(read_log(folder / "2027-03-10.toml").events).exposures
    taken = [each for each in exposures if each.target == "NGC 3621"]
    assert [float(row["image_size_arcsec"]) for row in rows] == [
        each.image_size_arcsec for each in reversed(taken)
    ]
    assert rows[0]["start"].endswith("Z")


def test_a_nights_report_is_written_from_where_it_is_looked_at(
    folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """In the form that the file's ending asks for; another ending is refused beside the field."""
    monkeypatch.chdir(tmp_path)

    async def told(trial: Trial, text: str) -> None:
        for _ in range(300):
            await trial.pilot.pause()
            if text in trial.text("notices"):
                return
            await asyncio.sleep(0.02)
        raise AssertionError(trial.text("notices"))

    async def story(trial: Trial) -> None:
        await opened(trial)
        await trial.press("enter", "e")
        await trial.type("night.doc")
        assert "expected a name that ends in .md" in trial.text("entry")
        await trial.press("escape", "e")
        await trial.type("night.md")
        await told(trial, "the night of 2027-03-12 is in night.md")
        await trial.press("e")
        await trial.type("night.md")
        await told(trial, "is there already; nothing was written")

    tell(folder, story)
    assert "2027-03-12" in (tmp_path / "night.md").read_text(encoding="utf-8")


def test_the_nights_work_goes_on_under_it(folder: Path) -> None:
    """The common key does the next thing for tonight, whatever past night is looked at."""

    async def story(trial: Trial) -> None:
        await opened(trial)
        await trial.press("enter", "space", "space", "space")
        await trial.wait(10.0)
        assert "EXPOSING" in trial.text("under-way")
        assert "night of 2027-03-12" in trial.text("view")

    tell(folder, story)


def test_an_index_that_fails_is_told_and_the_night_goes_on(
    folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Whatever the worker raises stands in the view; keys of the view do nothing then."""

    def broken(*_: object, **__: object) -> None:
        raise RuntimeError("the disk is on fire")

    monkeypatch.setattr("tui.console.views.past.PastIndex", broken)

    async def story(trial: Trial) -> None:
        await opened(trial)
        assert "past nights can't be read: the disk is on fire" in trial.text("view")
        await trial.press("enter", "tab", "e", "j", "escape")
        await trial.press("space")
        assert trial.watch.state.pointing is not None

    tell(folder, story)


def test_pictures_have_the_width_they_are_given() -> None:
    """Whatever the numbers: no cell too many, the shares in their order."""
    spent = {"open": 6.0, "lost": 2.0, "between": 1.0, "moving": 0.5, "ready": 0.5, "idle": 0.0}
    assert "".join(span.text for span in time_picture(spent, 20)) == "━" * 12 + "──›·╌╌╌╌"
    assert [len(time_picture(some, 9)) for some in ({}, {"open": 0.0}, {"idle": 3.0})] == [9] * 3
    for seeing in (None, Quartiles(0.1, 0.2, 0.3), Quartiles(1.0, 2.0, 9.0)):
        assert len(seeing_picture(seeing, 13)) == 13
    bars = histogram((0.0, 0.5, 1.0, 1.5), (0, 4, 2), 40, 10)
    assert len(bars) == 2
    assert all(width_of(bar) <= 40 for bar in bars)
    assert histogram((0.0, 1.0), (0,), 40, 10) == []
    together = histogram(range(9), (0, 1, 2, 3, 4, 5, 6, 0), 40, 3)
    assert [bar[0].text.strip() for bar in together] == ['1.00-3.00"', '3.00-5.00"', '5.00-7.00"']
    assert [bar[2].text for bar in together] == [" 3", " 7", " 11"]


def test_the_cursor_is_always_in_sight() -> None:
    """At either end and in the middle, the window holds the cursor and no more rows than fit."""
    for count in (0, 1, 5, 100):
        for cursor in range(count):
            shown = window(count, cursor, 7)
            assert cursor in shown
            assert len(shown) == min(count, 7)
