"""What earlier nights have done counts in the console's own planning, through the index."""

from __future__ import annotations

from datetime import timedelta
from pathlib import Path

import pytest

from engine.clock import HandClock
from engine.log import Event, Exposure, Header
from engine.log.header import header_bytes
from engine.logbook import load_logbook, typed_target
from engine.past.carry import done_before_by_folding
from engine.rehearsal import NIGHT
from engine.watch import Watch, acts, open_watch
from tests.engine.log_nights import DUSK_MJD, blocks_of
from tests.tui.trial import a_logbook, after_dusk_mjd

EARLIER = 8


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Return a small logbook with eight earlier nights: enough for the index to keep a file.

    "Sharp One" was finished in them; of "Sharp Two" two of six were taken; and "KR 99", which is
    on no list, was observed three times.
    """
    monkeypatch.setattr("platformdirs.user_cache_path", lambda name: tmp_path / "cache" / name)
    folder = a_logbook(tmp_path / "nights")
    observatory = load_logbook(folder).observatory
    taken = [
        [("Sharp One", "B", 30.0)], [("Sharp One", "B", 30.0), ("KR 99", "V", 60.0)],
        [("Sharp One", "V", 20.0)], [("Sharp One", "V", 20.0), ("Sharp Two", "V", 240.0)],
        [("Sharp Two", "V", 200.0)], [("KR 99", "V", 60.0)], [("KR 99", "V", 60.0)], [],
    ]  # fmt: skip
    for day, night_taken in enumerate(taken, start=1):
        night = NIGHT - timedelta(days=day)
        events: list[Event] = [
            Exposure(
                n=n, t_mjd=DUSK_MJD, of=0, target=target, filter=filter_, seconds=seconds,
                exposed_s=seconds, start_mjd=DUSK_MJD, mid_mjd=DUSK_MJD, end_mjd=DUSK_MJD,
                outcome="good", credit=0.8125,
            )
            for n, (target, filter_, seconds) in enumerate(night_taken, start=1)
        ]  # fmt: skip
        head = header_bytes(Header.of(observatory, night, ("R. Okonjo",), "warmroom 0.1.0"))
        (folder / f"{night.isoformat()}.toml").write_bytes(head + blocks_of(events))
    return folder


def planned(watch: Watch) -> None:
    """Make the plan that is wanted."""
    work = watch.planning()
    assert work is not None
    watch.adopt(work())


def test_done_counts_and_what_is_finished_steps_aside(folder: Path, tmp_path: Path) -> None:
    """The plan of tonight has what remains; no visit goes to a target whose plan is done."""
    watch = open_watch(folder, HandClock(after_dusk_mjd(folder)), ("A. Tester",), NIGHT).watch
    assert list((tmp_path / "cache").rglob("*.sqlite"))
    done = watch.planner.plans(watch.state)
    assert [(line.filter, line.done, line.remaining) for line in done["Sharp One"]] == [
        ("B", 2, 0), ("V", 2, 0),
    ]  # fmt: skip
    assert [(line.done, line.remaining, line.credit) for line in done["Sharp Two"]] == [
        (2, 4, 1.625)
    ]
    planned(watch)
    assert watch.plan is not None
    to_visit = {visit.target for visit in watch.plan.order.visits}
    assert "Sharp One" not in to_visit
    assert to_visit
    watch.close()


def test_a_target_that_comes_in_tonight_brings_what_was_done_of_it(folder: Path) -> None:
    """Three exposures of it stand in earlier logs: they count at once, and only once."""
    watch = open_watch(folder, HandClock(after_dusk_mjd(folder)), ("A. Tester",), NIGHT).watch
    wheel = [each.name for each in watch.planner.logbook.observatory.filters]
    target = typed_target("07:10:00 -31:00:00 V:60x5 KR 99", wheel)
    acts.insert(watch, target)
    planned(watch)
    for _ in range(2):
        line = watch.planner.plans(watch.state)["KR 99"][0]
        assert (line.planned, line.done, line.remaining) == (5, 3, 2)
        acts.undo(watch)
        planned(watch)
        assert "KR 99" not in watch.planner.plans(watch.state)
        acts.insert(watch, target)
        planned(watch)
    names = {each.name for each in watch.planner.night.targets}
    assert len(done_before_by_folding(folder, NIGHT, names)) == 9
    watch.close()
