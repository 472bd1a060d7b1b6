"""Questions about past nights, each against a count made another way."""

from __future__ import annotations

import math
import shutil
from collections import defaultdict
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.log import Amendment, Event, Exposure, LostTime, Note, Pointing, RunStart, RunStop
from engine.logbook import load_logbook, sample_logbook
from engine.night import plans
from engine.past import PastIndex, done_before
from engine.past.account import account
from engine.past.carry import done_before_by_folding
from engine.past.exposures import asked, history, programme_totals, refused, totals
from engine.past.nights import Period, efficiency, nights
from engine.past.search import Wanted, condition, find_exposures, find_words
from engine.past.seeing import measurements, site_seeing
from engine.rehearsal import play_unwatched, prepare
from engine.report import night_report
from engine.times import MINUTES_PER_DAY
from tests.engine.by_tomllib import by_tomllib
from tests.engine.log_nights import blocks_of
from tests.engine.past_logs import folded, small_archive


@pytest.fixture(scope="module")
def archive(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return a folder with twelve short nights and the sample's own files."""
    folder = tmp_path_factory.mktemp("archive") / "nights"
    small_archive(folder, nights=12, exposures=60)
    for name in ("observatory.toml", "targets.toml"):
        shutil.copy(sample_logbook() / name, folder)
    return folder


@pytest.fixture(scope="module")
def index(archive: Path) -> PastIndex:
    """Return the index of the twelve nights."""
    return PastIndex(archive, cache=archive.parent / "cache")


def test_three_nights_agree_with_a_count_by_tomllib_alone(tmp_path: Path) -> None:
    """The two sample nights and a third played now: every number, exactly."""
    rehearsal = prepare(tmp_path / "nights", date(2027, 3, 11), 11)
    play_unwatched(rehearsal)
    folder = rehearsal.folder
    names = [f"2027-03-{day}.toml" for day in (10, 11, 12)]
    plainly = {name: by_tomllib(folder / name) for name in names}
    index = PastIndex(folder)
    lines = nights(index)
    assert [line.name for line in lines] == names
    for line in lines:
        plain = plainly[line.name]
        assert line.state == "sound"
        assert line.entries == plain["entries"]
        assert (line.exposures, line.kept) == (plain["exposures"], plain["kept"])
        assert line.open_h * 3600.0 == pytest.approx(plain["open_s"], rel=1e-12)
        assert line.lost_h["cloud"] * 3600.0 == pytest.approx(plain["lost_s"], abs=0.002)
        assert line.seeing is not None
        assert line.seeing.count == len(plain["seeing"])
        assert line.seeing.median_arcsec == pytest.approx(float(np.median(plain["seeing"])))
    counts: dict[Any, int] = defaultdict(int)
    credit: dict[Any, list[float]] = defaultdict(list)
    for plain in plainly.values():
        for key, count in plain["counts"].items():
            counts[key] += count
            credit[key].append(plain["credit"][key])
    told = totals(index)
    assert {(t.target, t.filter, t.seconds, t.outcome): t.count for t in told} == counts
    for each in told:
        key = (each.target, each.filter, each.seconds, each.outcome)
        assert each.credit == pytest.approx(math.fsum(credit[key]), rel=1e-12)


def test_a_nights_time_adds_up(index: PastIndex) -> None:
    """Headings add up to the dark time, causes to what was lost, many nights to their sum."""
    lines = nights(index)
    for line in lines:
        assert line.dark_h is not None
        assert 8.0 < line.dark_h < 13.0
        assert sum(line.spent_h.values()) == pytest.approx(line.dark_h, rel=1e-12)
        assert sum(line.lost_h.values()) == pytest.approx(line.spent_h["lost"], abs=1e-12)
    spent = efficiency(lines)
    assert spent.nights == 12
    assert sum(spent.spent_h.values()) == pytest.approx(spent.dark_h, rel=1e-12)
    assert spent.open_share == pytest.approx(
        sum(line.spent_h["open"] for line in lines) / sum(line.dark_h or 0.0 for line in lines)
    )


def test_time_is_booked_by_what_was_the_case() -> None:
    """An invented hour, worked out by hand: each minute under its own heading."""

    def at(minutes: float) -> float:
        return 61000.0 + minutes / MINUTES_PER_DAY

    def exposed(n: int, begin: float, end: float) -> Exposure:
        return Exposure(
            n=n, t_mjd=at(end), of=0, target="KR 12", filter="B", seconds=600.0, exposed_s=600.0,
            start_mjd=at(begin), mid_mjd=at(begin), end_mjd=at(end), outcome="good",
        )  # fmt: skip

    events: list[Event] = [
        Pointing(n=1, t_mjd=at(5), target="KR 12"),
        Pointing(n=2, t_mjd=at(7), target="KR 12", on_target=True),
        RunStart(n=3, t_mjd=at(10), target="KR 12", filters=("B",), seconds=(600.0,), counts=(2,)),
        exposed(4, 11, 21),
        exposed(5, 22, 32),
        RunStop(n=6, t_mjd=at(33), of=3, why="finished"),
        LostTime(n=7, t_mjd=at(40), phase="begin", cause="wind"),
        LostTime(n=8, t_mjd=at(55), phase="end"),
        Note(n=9, t_mjd=at(56), text="calm again"),
    ]
    told = account(events, [(at(0), at(20)), (at(25), at(60))])
    minutes = {name: round(seconds / 60.0, 6) for name, seconds in told.spent_s.items()}
    # Dark from 0 to 20 and 25 to 60. Ready 7 to 10, 33 to 40, 55 to 56; idle 0 to 5, 56 to 60.
    assert minutes == {
        "open": 16.0, "lost": 15.0, "between": 2.0, "moving": 2.0, "ready": 11.0, "idle": 9.0,
    }  # fmt: skip
    assert told.dark_s == pytest.approx(55 * 60)
    assert {cause: round(s / 60.0, 6) for cause, s in told.lost_s.items()} == {"wind": 15.0}


def test_history_totals_and_reasons_are_those_of_the_fold(index: PastIndex, archive: Path) -> None:
    """One target's exposures in order, with the outcome they have now, and why."""
    states = folded(archive)
    every = [(name, each) for name, state in states.items() for each in state.exposures]
    target = every[0][1].target
    taken = history(index, target)
    assert [(each.log, each.n, each.outcome, each.credit) for each in taken] == [
        (name, each.n, each.outcome, each.credit) for name, each in every if each.target == target
    ]
    bad = [each for _, each in every if each.outcome != "good"]
    told = refused(index)
    assert bad
    assert [(each.outcome, each.reason) for each in told] == [("rejected", "trailed")]
    assert sum(each.count for each in told) == len(bad)


def test_programmes_add_up_to_their_targets(index: PastIndex, archive: Path) -> None:
    """Every line of every plan is in one programme; no more is done than was asked."""
    logbook = load_logbook(archive)
    lines = asked(index, logbook)
    sums = programme_totals(lines)
    assert {each.programme for each in sums} == {each.programme for each in logbook.targets}
    assert sum(each.targets for each in sums) == len(logbook.targets)
    planned = plans(logbook.targets, ())
    assert sum(each.asked for each in sums) == sum(
        line.planned for target in logbook.targets for line in planned[target.name]
    )
    assert all(0 <= each.done <= each.asked for each in sums)
    assert 0 < sum(each.done for each in sums) < sum(each.line.done for each in lines)
    left_s = sum(each.line.remaining * each.line.seconds for each in lines)
    assert sum(each.remaining_h for each in sums) == pytest.approx(left_s / 3600.0)
    finished = {each.target for each in lines} - {e.target for e in lines if e.line.remaining}
    assert sum(each.finished for each in sums) == len(finished)


def test_searching_by_condition_is_a_filter_over_the_fold(index: PastIndex, archive: Path) -> None:
    """Newest first, at most so many, every condition kept to the last digit."""
    every = [(name, each) for name, state in folded(archive).items() for each in state.exposures]
    wanted = Wanted(
        filter="V",
        conditions=(condition("airmass < 1.3"), condition("image_size_arcsec>=1.4")),
        period=Period(date(2018, 9, 3), date(2018, 9, 9)),
    )
    expected = [
        (name, each.n)
        for name, each in every
        if each.filter == "V"
        and each.airmass_mid is not None
        and each.airmass_mid < 1.3
        and each.image_size_arcsec is not None
        and each.image_size_arcsec >= 1.4
        and "2018-09-03" <= name[:10] <= "2018-09-09"
    ]
    found = find_exposures(index, wanted, most=10_000)
    assert expected
    assert [(each.log, each.n) for each in found] == expected[::-1]
    assert find_exposures(index, wanted, most=3) == found[:3]
    with pytest.raises(ValueError, match="quantities are"):
        condition("colour<3")
    with pytest.raises(ValueError, match="expected a quantity"):
        condition("airmass<1; DROP TABLE night")


HOSTILE = (
    'a "quoted" word', "it's * NEAR(x) AND OR NOT", "100 % humid_ity \\ back", "élan vital °C",
    "\x1b[31mred\x1b[0m", "-- DROP TABLE words;", "nul\x00 inside", "\u202edlrow", "日本 の 星",
    "word^3 col:on {brace}", "*", '"', "%",
)  # fmt: skip


@pytest.mark.parametrize("full_text", [True, False])
def test_hostile_text_is_only_text(tmp_path: Path, full_text: bool) -> None:
    """Whatever a note holds is found by itself, breaks nothing, and means nothing to the search."""
    folder = tmp_path / "nights"
    path = small_archive(folder)[0]
    notes = [Note(n=9000 + i, t_mjd=61474.5, text=text) for i, text in enumerate(HOSTILE)]
    path.write_bytes(path.read_bytes() + blocks_of([*notes]))
    with PastIndex(folder, cache=tmp_path) as index:
        index.has_full_text = index.has_full_text and full_text
        for text in HOSTILE:
            assert text in [each.text for each in find_words(index, text)], text
        assert find_words(index, "nowhere written") == ()
        assert [e.text for e in find_words(index, "QUOTED")] == ['a "quoted" word']


def test_seeing_of_many_nights(index: PastIndex, archive: Path) -> None:
    """Quartiles by numpy over the folds; every value counted once in each grouping."""
    measured = [each for state in folded(archive).values() for each in state.seeing]
    values = [each.zenith_arcsec for each in measured]
    assert sorted(measurements(index).mjd) == sorted(each.mjd for each in measured)
    site = site_seeing(measurements(index))
    assert site.all is not None
    assert site.all.count == len(values) == sum(site.counts)
    assert site.all.median_arcsec == pytest.approx(float(np.median(values)))
    assert site.all.upper_quartile_arcsec == pytest.approx(float(np.quantile(values, 0.75)))
    for groups in (site.by_month, site.by_hour, site.by_filter):
        assert sum(group.summary.count for group in groups) == len(values)
    assert sum(group.summary.count for group in site.by_airmass) == site.from_images
    assert [group.label for group in site.by_month] == ["September"]
    in_b = [group.summary for group in site.by_filter if group.label == "B"]
    assert len(in_b) == 1
    assert len(measurements(index, Period(until=date(2018, 9, 1))).nights) == 1


def test_what_remains_follows_every_change_of_verdict(
    archive: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    """Done counts tonight; rejected, it comes back on the plan; taken back, it is done again."""
    monkeypatch.setattr("platformdirs.user_cache_path", lambda name: tmp_path / "cache" / name)
    folder = tmp_path / "nights"
    shutil.copytree(archive, folder)
    target = load_logbook(folder).targets[0]
    plan = target.exposures[0]
    log = folder / "2018-09-05.toml"
    written = log.read_bytes()

    def remains() -> int:
        with PastIndex(folder, cache=tmp_path) as index:
            lines = [each.line for each in asked(index, load_logbook(folder))
                     if each.target == target.name and each.line.filter == plan.filter]  # fmt: skip
        done = done_before(folder, date(2027, 3, 14), {target.name})
        assert done == done_before_by_folding(folder, date(2027, 3, 14), {target.name})
        assert lines[0].done == sum(each.filter == plan.filter for each in done)
        return lines[0].remaining

    before = remains()
    events: list[Event] = [
        Exposure(
            n=9000 + i, t_mjd=61000.0, of=1, target=target.name, filter=plan.filter,
            seconds=plan.seconds, exposed_s=plan.seconds, start_mjd=61000.0, mid_mjd=61000.0,
            end_mjd=61000.0, outcome="good", credit=1.0,
        )
        for i in range(before)
    ]  # fmt: skip
    log.write_bytes(written + blocks_of(events))
    assert remains() == 0
    rejected = Amendment(n=9500, t_mjd=61000.1, of=9000, extra={"outcome": "rejected"})
    log.write_bytes(written + blocks_of([*events, rejected]))
    assert remains() == 1
    taken_back = Amendment(n=9501, t_mjd=61000.2, of=9500, withdrawn=True)
    log.write_bytes(written + blocks_of([*events, rejected, taken_back]))
    assert remains() == 0
    log.unlink()
    assert remains() == before


def test_past_and_report_tell_the_same_of_a_night(index: PastIndex, archive: Path) -> None:
    """Counts, hours, causes and seeing of each night are those of its report."""
    for line in nights(index):
        report = night_report(archive / line.name)
        assert line.exposures == len(report.exposures)
        assert line.kept == len(report.exposures) - len(report.refused)
        assert line.open_h * 3600.0 == pytest.approx(report.exposed_s)
        assert line.seeing == report.seeing
        for told_h, told_s in (
            (line.spent_h, report.account.spent_s),
            (line.lost_h, report.account.lost_s),
        ):
            assert told_h == pytest.approx({name: s / 3600.0 for name, s in told_s.items()})


SPANS = st.lists(
    st.tuples(st.integers(0, 600), st.integers(1, 120), st.sampled_from("eplra")), max_size=14
)


@given(SPANS, st.integers(0, 300), st.integers(0, 300))
def test_any_night_adds_up(spans: list[tuple[int, int, str]], begin: int, length: int) -> None:
    """Whatever overlaps whatever: headings add up to the dark, causes to what was lost."""

    def at(minutes: float) -> float:
        return 61000.0 + minutes / MINUTES_PER_DAY

    events: list[Event] = []
    for start, minutes, what in sorted(spans):
        n = len(events) + 1
        if what == "e":
            events.append(
                Exposure(
                    n=n, t_mjd=at(start + minutes), of=0, target="KR 12", filter="B", seconds=60.0,
                    exposed_s=60.0, start_mjd=at(start), mid_mjd=at(start), outcome="good",
                    end_mjd=at(start + minutes),
                )
            )  # fmt: skip
        elif what == "p":
            events.append(
                Pointing(n=n, t_mjd=at(start), target="KR 12", on_target=minutes % 2 == 0)
            )
        elif what == "l":
            causes = ("cloud", "wind")
            phase = "begin" if minutes % 3 else "end"
            events.append(LostTime(n=n, t_mjd=at(start), phase=phase, cause=causes[minutes % 2]))
        elif what == "r":
            steps = {"filters": ("B",), "seconds": (60.0,), "counts": (1,)}
            events.append(RunStart(n=n, t_mjd=at(start), target="KR 12", **steps))  # type: ignore[arg-type]
        else:
            events.append(RunStop(n=n, t_mjd=at(start), of=1, why="finished"))
    dark = [(at(begin), at(begin + length))] if length else []
    told = account(events, dark)
    assert told.dark_s == pytest.approx(length * 60.0, abs=0.01)
    assert sum(told.spent_s.values()) == pytest.approx(told.dark_s, abs=0.01)
    assert sum(told.lost_s.values()) == pytest.approx(told.spent_s["lost"], abs=0.01)
    assert all(seconds >= 0.0 for seconds in told.spent_s.values())
    # Minute by minute, by hand: is the middle of it within any exposure?
    exposed = [(each.start_mjd, each.end_mjd) for each in events if isinstance(each, Exposure)]
    minutes_open = sum(
        any(first <= at(minute + 0.5) < last for first, last in exposed)
        for minute in range(begin, begin + length)
    )
    assert told.spent_s["open"] == pytest.approx(minutes_open * 60.0, abs=0.01)
