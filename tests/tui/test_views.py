"""Stories of the views: each a key away, each telling what the night's tables say."""

from __future__ import annotations

from dataclasses import fields
from pathlib import Path

import numpy as np
import pytest

from tests.tui.trial import Trial, a_logbook, play
from tui.console.foot import foot_keys, foot_line
from tui.console.keys import Keys
from tui.console.panels.local import hhmm, whole_hours
from tui.console.views import NIGHT, VIEWS
from tui.console.views.classes import CLASSES
from tui.paint.spans import width_of

SIZES = [(80, 24), (120, 40), (160, 50)]


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook."""
    return a_logbook(tmp_path / "nights")


def test_every_view_of_the_table_is_there() -> None:
    """The light table and the classes name the same views, each with a key of its own."""
    assert [each.name for each in VIEWS if each.name != NIGHT] == list(CLASSES)
    assert len({each.key for each in VIEWS}) == len(VIEWS)


@pytest.mark.parametrize("width", range(10, 200, 7))
def test_the_foot_holds_whole_keys(width: int) -> None:
    """What does not fit whole is left out, and the view's own meaning of a key replaces another."""
    keys = foot_keys(Keys(), {"go_on": "accept"}, [("tab", "turn")])
    assert [word for key, word in keys if key == "tab"] == ["turn"]
    spans = foot_line(keys, width)
    assert sum(len(span.text) for span in spans) <= width
    shown = [
        (key.text.strip(), word.text.strip())
        for key, word in zip(spans[::2], spans[1::2], strict=True)
    ]
    assert [each for each in keys if each in shown] == shown
    assert width < 40 or shown[0] == ("space", "accept")


@pytest.mark.parametrize("size", SIZES)
def test_every_view_keeps_the_state_of_the_night_in_sight(
    folder: Path, size: tuple[int, int]
) -> None:
    """Head, strip and what is under way stay; a view has at least 13 rows and fits its place."""

    async def story(trial: Trial) -> None:
        await trial.press("space", "space", "space")
        await trial.wait(10.0)
        for entry in VIEWS:
            await trial.press(entry.key)
            assert trial.console.view == entry.name
            assert "Kestrel Ridge" in trial.text("head")
            assert "▼" in trial.text("night")
            assert "EXPOSING" in trial.text("under-way")
            if entry.name != NIGHT:
                shown = trial.console.sheet("view")
                assert entry.title.upper() in trial.text("view").splitlines()[0]
                assert shown.size.height - 1 >= 13
                lines = CLASSES[entry.name](trial.console, trial.watch).paint(
                    shown.size.width, shown.size.height - 1
                )
                assert 5 < len(lines) < shown.size.height
        await trial.press(VIEWS[0].key)
        assert trial.console.query_one("#list").display

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_the_sky_says_until_when_and_why(folder: Path, size: tuple[int, int]) -> None:
    """The chosen target's window is the table's; the cursor keys choose another."""

    async def story(trial: Trial) -> None:
        await trial.press("2")
        for _ in range(3):
            name = trial.console.chosen
            assert name is not None
            night = trial.watch.planner.night
            index = night.target_index(name)
            now = night.index_at(trial.clock.now_mjd())
            allowed = night.limits[index] == 0
            assert allowed[now]
            last = now + int(np.argmin(allowed[now:]))
            said = trial.text("view").splitlines()[1]
            assert name in said
            assert f"within its limits until {hhmm(trial.watch, float(night.mjd[last]))}" in said
            await trial.press("j")

    play(folder, story, size=size)


def test_the_sky_marks_visits_and_what_was_observed(folder: Path) -> None:
    """Every visit of the order has its number on the curves, and what is left out its reason."""

    async def story(trial: Trial) -> None:
        await trial.press("2")
        text = trial.text("view")
        assert trial.watch.plan is not None
        for number, visit in enumerate(trial.watch.plan.order.visits, start=1):
            assert f"{number} {visit.target}" in text
        trial.console.choose("Blunt")
        await trial.press("d")
        text = trial.text("view")
        assert "left out  1" in text
        assert "dropped for tonight by the observer" in text

    play(folder, story)


@pytest.mark.parametrize("size", SIZES)
def test_conditions_tell_what_is_measured_how_old_and_what_is_missing(
    folder: Path, size: tuple[int, int]
) -> None:
    """Nothing is made up: a usual value says so, what was typed has an age, the rest is missing."""

    async def story(trial: Trial) -> None:
        await trial.press("3")
        text = trial.text("view")
        assert "nothing measured yet" in text
        assert "nobody has entered" in text
        for word in ("wind", "humidity", "dew margin", "cloud", "air", "pressure"):
            assert word in text
        assert "●" not in text
        await trial.press("z")
        await trial.type("2.1")
        await trial.press("c", "w")
        await trial.type("13")
        await trial.wait(600.0)
        text = trial.text("view")
        assert "measured 10 min ago" in text
        assert "●" in text
        row = next(each for each in text.splitlines() if "wind" in each)
        assert row.startswith("!wind")
        assert "13 m/s" in row
        assert "above 12" in row
        assert "10 min" in row
        await trial.press("c", "t")
        await trial.type("12")
        await trial.press("c", "d")
        await trial.type("5")
        row = next(each for each in trial.text("view").splitlines() if "dew margin" in each)
        assert "7 °C" in row
        assert row.startswith(" dew")

    play(folder, story, size=size)


def test_conditions_give_image_and_sky_of_each_filter(folder: Path) -> None:
    """The sizes are the model's for the seeing now, the sky is the night's table."""

    async def story(trial: Trial) -> None:
        await trial.press("z")
        await trial.type("2.1")
        await trial.press("3")
        watch = trial.watch
        night = watch.planner.night
        assert trial.console.chosen is not None
        assert watch.plan is not None
        index = night.target_index(trial.console.chosen)
        at = night.index_at(trial.clock.now_mjd())
        seeing = watch.plan.forecast.now_arcsec
        lines = trial.text("view").splitlines()
        for place, each in enumerate(night.observatory.filters):
            size = watch.planner.model.size_arcsec(place, seeing, night.airmass[index, at])
            sky = night.sky_mag_arcsec2[place, index, at]
            (row,) = (line for line in lines if f' {each.name:<3} {float(size):.2f}"' in line)
            assert f"{sky:.1f}" in row

    play(folder, story)


@pytest.mark.parametrize("size", SIZES)
def test_the_image_view_takes_apart_what_the_model_gives(
    folder: Path, size: tuple[int, int]
) -> None:
    """Each term of each filter stands in figures, and the blur to blame is pointed at."""

    async def story(trial: Trial) -> None:
        await trial.press("4")
        trial.console.choose("Sharp One")
        await trial.wait(1.0)
        watch = trial.watch
        now = next(each for each in watch.targets_now() if each.target.name == "Sharp One")
        assert watch.plan is not None
        at = watch.planner.night.index_at(trial.clock.now_mjd())
        seeing = float(watch.plan.outlook.seeing_arcsec[at])
        lines = trial.text("view").splitlines()
        assert "diffraction" in lines[2]
        for row, each in zip(lines[3:], now.filters, strict=False):
            image = watch.planner.model.breakdown(
                each.filter_index, round(seeing, 2), round(now.airmass, 2)
            )
            assert row.startswith(f" {each.progress.filter}")
            assert f"{image.size_arcsec:.2f}" in row
            for field in fields(image.terms):
                value = f"{getattr(image.terms, field.name):.2f}"
                assert (f"▸{value}" if field.name == image.blame else f" {value}") in row
        hours = next(each for each in lines if each.startswith(" at"))
        moments = whole_hours(watch, (size[0] - 3) // 6, least_min=30.0)
        assert hours.split()[1:] == [hhmm(watch, mjd) for mjd in moments]

    play(folder, story, size=size)


@pytest.mark.parametrize("size", SIZES)
def test_the_image_view_says_what_is_soft_and_when(folder: Path, size: tuple[int, int]) -> None:
    """In bad seeing the target with a limit is soft now; tab gives the bands all the place."""

    async def story(trial: Trial) -> None:
        await trial.press("4", "tab")
        assert "one target" in trial.text("foot")
        text = trial.text("view")
        plan, night = trial.watch.plan, trial.watch.planner.night
        assert plan is not None
        index = night.target_index("Sharp Two")
        place = night.observatory.filter_index("V")
        later = np.arange(night.last + 1) >= night.index_at(trial.clock.now_mjd())
        soft = plan.outlook.soft[place, index] & (night.limits[index] == 0) & later
        first = hhmm(trial.watch, float(night.mjd[int(np.argmax(soft))]))
        assert f"soft {first}" in band_of(text, "Sharp Two")
        assert "─" in band_of(text, "Sharp One")
        await trial.press("z")
        await trial.type("4.5")
        trial.console.choose("Sharp Two")
        await trial.wait(1.0)
        row = band_of(trial.text("view"), "Sharp Two")
        assert "█" in row
        assert "soft now" in row
        assert ("atmosphere" in row) == (size[0] >= 120)
        await trial.press("tab")
        lines = trial.text("view").splitlines()
        limit = night.targets[index].maximum_image_size_arcsec
        assert f'limit {limit:g}"' in lines[1]
        assert lines[3].startswith(" V !")

    play(folder, story, size=size)


def band_of(text: str, name: str) -> str:
    """Return the line of one target among the bands."""
    lines = text.splitlines()
    first = next(place for place, each in enumerate(lines) if "soft, and when" in each)
    return next(each for each in lines[first:] if name in each)


def test_every_view_fits_any_place(folder: Path) -> None:
    """No place is a fault; from 79x13 on a view paints no wider and no higher than its place."""

    async def story(trial: Trial) -> None:
        await trial.press("z")
        await trial.type("4.5")
        for name in ("sky", "conditions", "image"):
            view = CLASSES[name](trial.console, trial.watch)
            for width in (12, 40, 60, 79, 80, 99, 119, 120, 161, 240):
                for height in (1, 2, 5, 9, 13, 22, 33, 60):
                    lines = view.paint(width, height)
                    assert lines
                    if width >= 79 and height >= 13:
                        assert len(lines) <= height, (name, width, height)
                        assert max(map(width_of, lines)) <= width, (name, width, height)

    play(folder, story)
