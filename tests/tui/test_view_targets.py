"""Stories of the targets view: progress by programme, and the logbook changed from the console."""

from __future__ import annotations

from pathlib import Path

import pytest

from engine.log import Note
from engine.logbook import load_logbook
from tests.tui.trial import SIZES, TARGETS, Trial, a_logbook, play
from tui.console.views.targets_pages import Done, declination_text, right_ascension_text

TWO = (
    TARGETS
    + """
[[programme]]
name = "Standards"
investigator = "M. Vey"

[[target]]
name = "Field 9"
programme = "Standards"
ra = 150.25
dec = -45.5
exposures = [ { filter = "V", seconds = 10, count = 3 } ]
"""
)


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook of two programmes."""
    return a_logbook(tmp_path / "nights", TWO)


def told(trial: Trial) -> str:
    """Return all that the console has told."""
    return "\n".join(each.text for each in trial.console.notices)


@pytest.mark.parametrize("size", SIZES)
def test_progress_is_told_by_programme_in_count_and_depth(
    folder: Path, size: tuple[int, int]
) -> None:
    """The heading's figures are the sums of its targets' plans."""

    async def story(trial: Trial) -> None:
        watch = trial.watch
        trial.take_first_run()
        await trial.press("6")
        rows = trial.text("view").splitlines()
        (heading,) = (row for row in rows if row.startswith(" Trial"))
        plans = watch.plans()
        names = ("Sharp One", "Sharp Two", "Blunt")
        done = Done.of(line for name in names for line in plans[name])
        assert (done.done, done.planned) == (4, 13)
        assert " 4/13 " in heading
        assert f"depth {done.credit:.1f}" in heading
        assert "█" in heading
        (other,) = (row for row in rows if row.startswith(" Standards"))
        assert " 0/3 " in other
        assert "depth 0.0" in other
        (row,) = (row for row in rows if row.startswith(" ✓ Sharp One"))
        assert "B2/2 V2/2" in row
        assert rows.index(heading) < rows.index(row) < rows.index(other)

    play(folder, story, size=size)


def test_the_cursor_goes_in_this_views_order(folder: Path) -> None:
    """It is the console's cursor, moved programme by programme; a search keeps what it holds."""

    async def story(trial: Trial) -> None:
        await trial.press("6", "home")
        assert trial.console.chosen == "Sharp One"
        await trial.press("j", "j", "j")
        assert trial.console.chosen == "Field 9"
        await trial.press("slash")
        await trial.type("stand")
        text = trial.text("view")
        assert "Field 9" in text
        assert "Blunt" not in text

    play(folder, story, size=(80, 24))


@pytest.mark.parametrize("size", SIZES)
@pytest.mark.parametrize("place", ["09:10:00 -40:20:00", "137.5 -40.3333"])
def test_a_target_is_added_and_comes_into_the_order(
    folder: Path, size: tuple[int, int], place: str
) -> None:
    """Four lines; wrong ones say so beside the field and what was typed stays."""

    async def story(trial: Trial) -> None:
        await trial.press("6", "i")
        await trial.type("Blunt")
        assert "called Blunt already" in trial.text("entry")
        assert "Blunt▏" in trial.text("entry")
        await trial.type(" 2")
        await trial.type("09:10:00")
        assert "expected" in trial.text("entry")
        assert "09:10:00▏" in trial.text("entry")
        await trial.press("ctrl+e", *["backspace"] * 8)
        await trial.type(place)
        await trial.type("W:60x2")
        assert "no filter is called 'W'" in trial.text("entry")
        await trial.press("ctrl+u")
        await trial.type("V:60x2")
        assert "Trial▏" in trial.text("entry") or "Standards▏" in trial.text("entry")
        await trial.press("enter")
        assert "Blunt 2 is in the logbook" in told(trial)
        assert trial.watch.plan is not None
        assert "Blunt 2" in [visit.target for visit in trial.watch.plan.order.visits]
        assert trial.console.chosen == "Blunt 2"
        assert "Blunt 2" in trial.text("view")
        found = load_logbook(folder).targets[-1]
        assert found.name == "Blunt 2"
        assert (found.ra_deg, found.dec_deg) == pytest.approx((137.5, -40.3333), abs=1e-4)
        assert (folder / "targets.toml").read_text() == TWO
        await trial.press("u")
        assert not (folder / "targets" / "added.toml").exists()
        names = [each.name for each in trial.watch.planner.night.targets]
        assert "Blunt 2" not in names, told(trial)

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_a_key_is_edited_where_it_stands(folder: Path, size: tuple[int, int]) -> None:
    """The old value is there to be changed; the log says what it was; u takes it back."""

    async def story(trial: Trial) -> None:
        await trial.press("6", "home", "e")
        await trial.type("priorty")
        assert "nearest is 'priority'" in trial.text("entry")
        await trial.press("ctrl+u")
        await trial.type("p")
        assert "5▏" in trial.text("entry")
        await trial.press("backspace")
        await trial.type("7")
        assert "expected" in trial.text("entry")
        await trial.press("backspace")
        await trial.type("2")
        new = TWO.replace("priority = 5", "priority = 2")
        assert (folder / "targets.toml").read_text() == new
        assert trial.watch.planner.night.targets[0].priority == 2
        notes = [each for each in trial.watch.state.events if isinstance(each, Note)]
        assert "priority of Sharp One was 5" in notes[-1].text
        await trial.press("u")
        assert (folder / "targets.toml").read_text() == TWO
        assert trial.watch.planner.night.targets[0].priority == 5

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_an_import_shows_all_faults_then_comes_in(folder: Path, size: tuple[int, int]) -> None:
    """Nothing is half-read; a row of a table is not edited here and says where it is."""
    source = folder.parent / "mine.csv"
    rows = "name,ra,dec,exposures\nT 1,10:00:00,-30:00:00,V:60x2\nT 2,150.5,-31,B:60x2\n"

    async def story(trial: Trial) -> None:
        source.write_text(rows.replace("V:60", "Q:60").replace("-31", "-131"))
        await trial.press("6", "m")
        trial.console._entry.take_text(str(source))
        await trial.press("enter")
        text = trial.text("view")
        assert "2 faults: nothing was changed" in text
        assert "'Q' is not in the wheel" in text
        assert "-131" in text
        await trial.press("escape")
        source.write_text(rows)
        await trial.press("m")
        trial.console._entry.take_text(str(source))
        await trial.press("enter")
        assert "mine.csv came in" in told(trial)
        assert "T 2" in trial.watch.plans()
        assert "no programme" in trial.text("view")
        trial.console.choose("T 2")
        await trial.press("e")
        assert "row of mine.csv, line 3" in told(trial)

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_a_target_in_full(folder: Path, size: tuple[int, int]) -> None:
    """Every key, where it stands, and the letter that edits it."""

    async def story(trial: Trial) -> None:
        trial.console.choose("Sharp Two")
        await trial.press("6")
        if size[0] < 130:
            await trial.press("tab")
        text = trial.text("view")
        assert "targets.toml, line " in text
        assert " x exposures" in text
        await trial.press("pagedown", "pagedown")
        text += trial.text("view")
        assert "V:240x6" in text
        assert " i maximum_image_size_arcsec" in text

    play(folder, story, size=size)


def test_names_from_a_file_stay_text(tmp_path: Path) -> None:
    """Markup in a name is shown, not obeyed."""
    book = a_logbook(tmp_path / "book", TARGETS.replace("Sharp One", "[/][@click=app.quit]x[/]"))

    async def story(trial: Trial) -> None:
        await trial.press("6", "home")
        assert "[/][@click=ap" in trial.text("view")
        assert trial.console.is_running

    play(book, story, size=(80, 24))


@pytest.mark.parametrize(
    ("ra_deg", "dec_deg", "said"),
    [
        (0.0, 0.0, "00:00:00.00 +00:00:00.0"),
        (359.99999999, -0.00001, "00:00:00.00 -00:00:00.0"),
        (83.633083, 22.0145, "05:34:31.94 +22:00:52.2"),
        (187.5, -89.99999, "12:30:00.00 -90:00:00.0"),
    ],
)
def test_places_are_rounded_as_a_whole(ra_deg: float, dec_deg: float, said: str) -> None:
    """No sixty seconds, no twenty-four hours. M 1 by its published place, the others by hand."""
    assert f"{right_ascension_text(ra_deg)} {declination_text(dec_deg)}" == said
