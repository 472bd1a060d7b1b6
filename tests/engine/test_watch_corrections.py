"""Putting the log and the logbook right while the night runs: amendments, and files that follow."""

from __future__ import annotations

from pathlib import Path

import pytest

from engine.clock import HandClock
from engine.errors import LogbookFaults, NotNow
from engine.log import Conditions, Exposure, Note, TargetAdded, fold, read_log
from engine.logbook import load_logbook
from engine.rehearsal import NIGHT
from engine.watch import Watch, acts, book
from engine.watch.corrections import amend, as_it_stands, reject_or_restore, withdraw_or_restore
from tests.engine.watch_nights import a_console, evening_clock, plan, small_logbook

NEW = {
    "name": "Nova",
    "ra": "08:00:00",
    "dec": "-30:00:00",
    "exposures": [{"filter": "V", "seconds": 60.0, "count": 2}],
}


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a small logbook."""
    return small_logbook(tmp_path)


def expose(watch: Watch, clock: HandClock) -> Exposure:
    """Take the run of the nearer target to its end; return its last exposure."""
    acts.point_at(watch, "Near")
    acts.arrive(watch)
    acts.start_run(watch, acts.lines_now(watch))
    for _ in range(30):
        clock.advance_s(10.0)
        watch.tick()
    return watch.state.exposures[-1]


def test_a_filter_put_right_brings_all_that_follows(folder: Path) -> None:
    """What the amended record says is what would have been recorded in that filter."""
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        in_v = expose(watch, clock)
        in_b = watch.state.exposures[0]
        assert (in_b.filter, in_v.filter) == ("B", "V")
        amendment = amend(watch, in_b.n, "filter", "V")
        found = as_it_stands(watch.state, in_b.n)
        assert isinstance(found, Exposure)
        assert found.filter == "V"
        assert found.airmass_mid == in_b.airmass_mid
        assert found.image_size_arcsec is not None
        assert in_b.image_size_arcsec is not None
        assert found.image_size_arcsec < in_b.image_size_arcsec
        assert found.image_size_arcsec == pytest.approx(in_v.image_size_arcsec, abs=0.01)
        line_b, line_v = watch.plans()["Near"]
        assert (line_b.done, line_v.done) == (1, 3)
        assert watch.state.event(in_b.n) == in_b
        withdraw_or_restore(watch, amendment.n)
        assert as_it_stands(watch.state, in_b.n) == in_b
        written = watch.state
    assert fold(read_log(folder / f"{NIGHT}.toml").events) == written


def test_a_fwhm_put_right_brings_its_seeing_and_takes_it_back(folder: Path) -> None:
    """One typed wrongly: the seeing that followed is amended with it, and comes back with it."""
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        last = expose(watch, clock)
        acts.measured_fwhm(watch, 2.0)
        wrong = watch.state.seeing[-1]
        amendment = amend(watch, last.n, "measured_fwhm_arcsec", 3.0)
        right = watch.state.seeing[-1]
        assert right.n == wrong.n
        assert right.zenith_arcsec > wrong.zenith_arcsec
        again = as_it_stands(watch.state, last.n)
        assert isinstance(again, Exposure)
        assert again.measured_fwhm_arcsec == 3.0
        withdraw_or_restore(watch, amendment.n)
        assert watch.state.seeing[-1] == wrong


def test_an_exposure_is_rejected_and_restored(folder: Path) -> None:
    """It counts, does not, and does again; the log has both amendments."""
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        expose(watch, clock)
        first = watch.state.exposures[0]
        reject_or_restore(watch, first.n, "trailed")
        assert watch.plans()["Near"][0].done == 1
        assert first.n not in [each.n for each in watch.state.kept]
        reject_or_restore(watch, first.n)
        assert watch.plans()["Near"][0].done == 2


def test_an_entry_is_withdrawn_and_restored_again_and_again(folder: Path) -> None:
    """A restored entry can be withdrawn again."""
    with a_console(folder, evening_clock(folder)) as watch:
        note = acts.note(watch, "clouds in the south")
        for _ in range(2):
            withdraw_or_restore(watch, note.n)
            assert not watch.state.notes
            withdraw_or_restore(watch, note.n)
            assert [each.text for each in watch.state.notes] == ["clouds in the south"]


def test_what_cannot_be_amended_says_so(folder: Path) -> None:
    """What happened stands, a seeing that follows from a FWHM is that of its exposure."""
    clock = evening_clock(folder)
    with a_console(folder, clock) as watch:
        last = expose(watch, clock)
        acts.measured_fwhm(watch, 2.0)
        entered = next(each for each in watch.state.events if isinstance(each, Conditions))
        count = len(watch.state.events)
        with pytest.raises(NotNow, match="not for the observer"):
            amend(watch, last.n, "airmass_mid", 1.0)
        with pytest.raises(NotNow, match="not for the observer"):
            amend(watch, entered.n, "seeing_arcsec", 1.0)
        with pytest.raises(NotNow, match="stands"):
            withdraw_or_restore(watch, last.n)
        with pytest.raises(NotNow, match="only an exposure"):
            reject_or_restore(watch, entered.n)
        with pytest.raises(NotNow, match="no entry"):
            withdraw_or_restore(watch, 9999)
        assert len(watch.state.events) == count


def test_an_added_target_is_in_file_log_and_order_and_can_be_put_back(folder: Path) -> None:
    """All three say the same; a later night finds it in the file."""
    with a_console(folder, evening_clock(folder)) as watch:
        done = book.add(watch, NEW)
        plan(watch)
        assert [each.name for each in load_logbook(folder).targets] == ["Near", "Far", "Nova"]
        assert [each.name for each in watch.state.added] == ["Nova"]
        assert watch.plan is not None
        assert "Nova" in [visit.target for visit in watch.plan.order.visits]
        book.put_back(watch, done)
        plan(watch)
        assert "Nova" not in [each.name for each in watch.planner.night.targets]
        assert not watch.state.added


def test_an_edited_target_is_said_and_the_plan_follows(folder: Path) -> None:
    """The log has a note about it; the target's plan is the file's."""
    with a_console(folder, evening_clock(folder)) as watch:
        more = [{"filter": "V", "seconds": 240.0, "count": 9}]
        book.change(watch, "Far", "exposures", more, "exposures of Far are V:240x9")
        plan(watch)
        assert watch.plans()["Far"][0].planned == 9
        said = watch.state.events[-1]
        notes = [each for each in watch.state.events if isinstance(each, Note)]
        assert "V:240x9" in notes[-1].text
        assert notes[-1].target == "Far"
        assert said.n >= notes[-1].n


def test_a_fault_writes_neither_file_nor_log(folder: Path) -> None:
    """An unknown filter: nothing happened."""
    with a_console(folder, evening_clock(folder)) as watch:
        count = len(watch.state.events)
        bad = {**NEW, "exposures": [{"filter": "X", "seconds": 1.0, "count": 1}]}
        with pytest.raises(LogbookFaults):
            book.add(watch, bad)
        with pytest.raises(LogbookFaults):
            book.change(watch, "Far", "priority", 9, "nothing")
        assert len(watch.state.events) == count
        assert not (folder / "targets" / "added.toml").exists()


def test_files_changed_by_somebody_are_read_anew(folder: Path) -> None:
    """The log says what is new and what changed; without a change nothing is done."""
    with a_console(folder, evening_clock(folder)) as watch:
        with pytest.raises(NotNow, match="what they said"):
            book.reload(watch)
        path = folder / "targets.toml"
        new = path.read_text().replace("count = 6", "count = 7").replace('"Near"', '"Nearer"')
        path.write_text(new)
        said = book.reload(watch)
        assert isinstance(said, Note)
        assert "new: Nearer; changed: Far; gone: Near" in said.text
        plan(watch)
        assert watch.plans()["Far"][0].planned == 7


def test_an_import_comes_into_the_night(
    folder: Path, tmp_path_factory: pytest.TempPathFactory
) -> None:
    """All targets of the file are in the plans; the log names them."""
    source = tmp_path_factory.mktemp("mine") / "more.csv"
    source.write_text("name,ra,dec,exposures\nT 1,08:00:00,-30:00:00,V:60x2\n")
    with a_console(folder, evening_clock(folder)) as watch:
        book.take_in(watch, source)
        plan(watch)
        assert "T 1" in watch.plans()
        notes = [each for each in watch.state.events if isinstance(each, Note)]
        assert "more.csv came in, targets 1: T 1" in notes[-1].text
        assert not any(isinstance(each, TargetAdded) for each in watch.state.events)
