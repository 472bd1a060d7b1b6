"""Stories of the log view: it follows, searches, shows an entry in full, and puts entries right."""

from __future__ import annotations

import time
from dataclasses import replace
from pathlib import Path

import pytest

from engine.log import Amendment, Note, fold, read_log
from engine.rehearsal import NIGHT
from engine.watch import acts
from tests.tui.trial import SIZES, Trial, a_logbook, play
from tui.console.views.records import Records

HOSTILE = "\x1b]0;owned\x07[/][@click=app.quit]x[/] \u202eevil\u200b"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook."""
    return a_logbook(tmp_path / "nights")


async def a_run(trial: Trial) -> None:
    """Take the first target's run to its end, and open the log."""
    trial.take_first_run()
    await trial.press("5")


def view_of(trial: Trial) -> Records:
    """Return the view that is shown."""
    view = trial.console._shown_view
    assert isinstance(view, Records)
    return view


def last_row(trial: Trial) -> str:
    """Return the last row of the list with anything in it."""
    rows = [row for row in trial.text("view").splitlines() if row.strip(" │")]
    return rows[-1]


async def put_cursor_on(trial: Trial, n: int) -> None:
    """Go up, or down, to an entry."""
    view = view_of(trial)
    view.move(1, "ends")
    while view._at_n != n:
        before = view._at_n
        view.move(-1, "rows")
        assert view._at_n != before, f"the cursor never came to {n}"
    trial.console.paint()


@pytest.mark.parametrize("size", SIZES)
def test_it_follows_until_it_is_scrolled(folder: Path, size: tuple[int, int]) -> None:
    """The newest is at the bottom; a cursor that was moved stays on its entry; end follows."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        assert "following" in trial.text("view")
        await trial.press("n")
        await trial.type("first")
        assert view_of(trial)._at_n == trial.watch.state.notes[-1].n
        assert "first" in trial.text("view")
        await trial.press("up", "up")
        at = view_of(trial)._at_n
        await trial.press("n")
        await trial.type("second")
        assert view_of(trial)._at_n == at
        assert "end follows again" in trial.text("view")
        await trial.press("G")
        assert view_of(trial)._at_n == trial.watch.state.notes[-1].n
        assert "following" in trial.text("view")

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_a_search_finds_and_goes_from_match_to_match(folder: Path, size: tuple[int, int]) -> None:
    """Matches are marked and counted; keys go round them; escape puts the search aside."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        for text in ("cloud bank west", "nothing", "Cloud gone"):
            await trial.press("n")
            await trial.type(text)
        await trial.press("slash")
        await trial.type("cloud")
        assert "'cloud': 2 of 2" in trial.text("view")
        assert sum(row.startswith("»") for row in trial.text("view").splitlines()) == 2
        await trial.press("left")
        assert "'cloud': 1 of 2" in trial.text("view")
        await trial.press("left")
        assert "'cloud': 2 of 2" in trial.text("view")
        await trial.press("slash")
        await trial.type("wolkig")
        assert "'wolkig': not found" in trial.text("view")
        await trial.press("escape")
        assert "wolkig" not in trial.text("view")

    play(folder, story, size=size)


def test_kinds_are_shown_apart(folder: Path) -> None:
    """Tab goes through the kinds; what is shown is of that kind alone."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        await trial.press("tab", "tab")
        count = len(trial.watch.state.exposures)
        assert f"{count} of {len(trial.watch.state.events)} entries" in trial.text("view")
        for row in trial.text("view").splitlines()[2 : 2 + count]:
            assert "exposure" in row

    play(folder, story, size=(80, 24))


@pytest.mark.parametrize("size", SIZES)
def test_an_entry_in_full_with_its_check_sum(folder: Path, size: tuple[int, int]) -> None:
    """Every key of it and the file's line; one that was changed by hand is said to be so."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        await trial.press("n")
        await trial.type("unique words")
        path = folder / f"{NIGHT}.toml"
        while trial.watch.unwritten:
            await trial.wait(1.0)
        await trial.press("end")
        if size[0] < 120:
            await trial.press("enter")
        n = next(e.n for e in trial.watch.state.events if isinstance(e, Note))
        await put_cursor_on(trial, n)
        row = 1 + path.read_text().splitlines().index(f"n = {n}")
        text = trial.text("view")
        assert f"line {row - 1} of {path.name}, check sum good" in text
        assert "target" in text
        path.write_text(path.read_text().replace("unique words", "other words."))
        await trial.wait(1.0)
        assert "check sum wrong" in trial.text("view")

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_an_exposure_is_put_right(folder: Path, size: tuple[int, int]) -> None:
    """A filter typed wrongly says so beside it and stays; the right one shows new and old."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        first = trial.watch.state.exposures[0]
        await put_cursor_on(trial, first.n)
        await trial.press("e", "f", "backspace")
        await trial.type("Q")
        assert "'Q' is none" in trial.text("entry")
        assert "Q▏" in trial.text("entry")
        await trial.press("backspace")
        await trial.type("V")
        amendment = trial.watch.state.events[-1]
        amendments = [e for e in trial.watch.state.events if isinstance(e, Amendment)]
        assert amendments, trial.text("notices") + trial.text("entry")
        assert amendments[-1].of == first.n
        assert amendments[-1].changes["filter"] == "V"
        assert amendment.n >= amendments[-1].n
        if size[0] < 120:
            await trial.press("enter")
        assert "~ V  was B" in trial.text("view")
        await trial.press("u")
        assert "~ V  was B" not in trial.text("view")

    play(folder, story, size=size)


def test_rejecting_restoring_and_withdrawing(folder: Path) -> None:
    """Each is an amendment, each can be taken back by the same key."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        first = trial.watch.state.exposures[0]
        await put_cursor_on(trial, first.n)
        await trial.press("x")
        await trial.type("trailed")
        found = next(e for e in trial.watch.state.exposures if e.n == first.n)
        assert found.outcome == "rejected"
        assert "rejected" in trial.text("view")
        await trial.press("x")
        found = next(e for e in trial.watch.state.exposures if e.n == first.n)
        assert found.outcome == "good"
        await trial.press("d")
        assert "that happened, and stands" in trial.text("notices")
        await trial.press("n")
        await trial.type("to be withdrawn")
        note = next(e for e in trial.watch.state.events if isinstance(e, Note))
        await put_cursor_on(trial, note.n)
        await trial.press("d")
        assert note.n in trial.watch.state.withdrawn
        assert "to be withdrawn, withdrawn" in trial.text("view")
        await trial.press("d")
        assert note.n not in trial.watch.state.withdrawn

    play(folder, story, size=(120, 40))
    written = fold(read_log(folder / f"{NIGHT}.toml").events)
    assert len([e for e in written.events if isinstance(e, Amendment)]) == 4


def test_a_note_is_corrected_from_what_it_said(folder: Path) -> None:
    """The old text stands in the field to be changed."""

    async def story(trial: Trial) -> None:
        await trial.press("5", "n")
        await trial.type("cluod")
        note = trial.watch.state.notes[0]
        await put_cursor_on(trial, note.n)
        await trial.press("e", "x")
        assert "cluod▏" in trial.text("entry")
        await trial.press("backspace", "backspace", "backspace")
        await trial.type("oud")
        assert trial.watch.state.notes[0].text == "cloud"

    play(folder, story, size=(80, 24))


@pytest.mark.parametrize("size", SIZES)
def test_hostile_text_stays_text(folder: Path, size: tuple[int, int]) -> None:
    """What a note holds can't act on the terminal or the program."""

    async def story(trial: Trial) -> None:
        acts.note(trial.watch, HOSTILE)
        await trial.press("5", "enter")
        await trial.wait(1.0)
        text = trial.text("view")
        assert "\x1b" not in text
        assert "\u202e" not in text
        assert "\\x1b]0;owned" in text
        assert trial.console.is_running

    play(folder, story, size=size)


def test_a_long_night_is_scrolled_without_delay(folder: Path) -> None:
    """Of 3,000 entries only those in sight are painted: a paint takes no longer than of 300."""

    async def story(trial: Trial) -> None:
        await a_run(trial)
        first = trial.watch.state.exposures[0]
        took: list[float] = []
        for count in (300, 3000):
            events = tuple(replace(first, n=n) for n in range(1, count + 1))
            trial.watch._state = fold(events)
            trial.watch.version += 1
            view = Records(trial.console, trial.watch)
            assert view.move(-1, "ends")
            view.paint(80, 15)
            begin = time.perf_counter()
            for _ in range(40):
                view.move(1, "screens")
                view.paint(80, 15)
            took.append(time.perf_counter() - begin)
        # Generous: the machine is shared, and what is held is that it does not grow tenfold.
        assert took[1] < 4.0 * took[0]

    play(folder, story, size=(80, 24))
