"""The report of a night: its numbers against a count by tomllib alone, its forms read back."""

from __future__ import annotations

import json
import math
import re
from collections import defaultdict
from dataclasses import replace
from datetime import date
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest
from astropy import units
from astropy.table import Table
from astropy.time import Time
from hypothesis import given
from hypothesis import strategies as st

from engine.errors import WarmroomError
from engine.log import Note
from engine.logbook import sample_logbook
from engine.rehearsal import play_unwatched, prepare
from engine.report import NightReport, night_report, save
from engine.report.content import sections
from engine.report.markdown import as_markdown, escaped
from engine.report.page import as_html
from engine.report.plain import as_data
from engine.report.svg import steps
from engine.report.tables import FIELDS, exposure_table
from tests.engine.by_tomllib import by_tomllib

VOID = {"meta", "br", "hr", "img", "input", "link"}


@pytest.fixture(scope="module")
def nights(tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    """Return the two sample nights and a third played now."""
    rehearsal = prepare(tmp_path_factory.mktemp("played") / "nights", date(2027, 3, 11), 11)
    play_unwatched(rehearsal)
    return [rehearsal.folder / f"2027-03-{day}.toml" for day in (10, 11, 12)]


@pytest.fixture(scope="module")
def report(nights: list[Path]) -> NightReport:
    """Return the report of one of them."""
    return night_report(nights[-1])


def test_the_numbers_are_those_of_a_count_by_tomllib_alone(nights: list[Path]) -> None:
    """Counts, seconds, depth, seeing, lost time: exactly."""
    for path in nights:
        plain, told = by_tomllib(path), night_report(path)
        assert len(told.exposures) == plain["exposures"]
        assert sum(each.good for each in told.totals) == plain["kept"]
        assert told.exposed_s == pytest.approx(plain["open_s"], rel=1e-12)
        good = {
            (each.target, each.filter, each.seconds): (each.good, each.credit)
            for each in told.totals
        }
        for (target, filter_, seconds, outcome), count in plain["counts"].items():
            if outcome == "good":
                found = good[target, filter_, seconds]
                assert found[0] == count
                credit = plain["credit"][target, filter_, seconds, outcome]
                assert found[1] == pytest.approx(credit, rel=1e-12)
        taken: dict[tuple[str, str, float], int] = defaultdict(int)
        for key, count in plain["counts"].items():
            taken[key[:3]] += count
        assert {(t.target, t.filter, t.seconds): t.taken for t in told.totals} == taken
        assert told.seeing is not None
        assert told.seeing.count == len(plain["seeing"])
        assert told.seeing.median_arcsec == pytest.approx(float(np.median(plain["seeing"])))
        lost_s = sum(each.end_mjd - each.begin_mjd for each in told.lost if each.end_mjd) * 86400.0
        assert lost_s == pytest.approx(plain["lost_s"], abs=0.002)


def test_the_times_add_up_to_the_night(nights: list[Path]) -> None:
    """Every second of the dark is under one heading, every lost one under one cause."""
    for path in nights:
        account = night_report(path).account
        assert account.dark_s > 3600.0
        assert math.fsum(account.spent_s.values()) == pytest.approx(account.dark_s, abs=1e-6)
        assert math.fsum(account.lost_s.values()) == pytest.approx(
            account.spent_s["lost"], abs=1e-6
        )


@pytest.mark.parametrize(
    ("ending", "form"), [("csv", "ascii.csv"), ("ecsv", "ascii.ecsv"), ("vot", "votable")]
)
def test_tables_are_read_back_by_astropy(
    report: NightReport, tmp_path: Path, ending: str, form: str
) -> None:
    """Values, what is not known, and where the form has them units and descriptions."""
    path = tmp_path / f"night.{ending}"
    save(report, path)
    read = Table.read(path, format=form)
    made = exposure_table(report)
    assert read.colnames == made.colnames
    assert len(read) == len(report.exposures)
    for field in FIELDS:
        known = [getattr(each, field.field) for each in report.exposures]
        if field.kind is float:
            masked = np.ma.getmaskarray(np.ma.asarray(read[field.name]))
            assert masked.tolist() == [value is None for value in known]
            values = [value for value in known if value is not None]
            assert np.asarray(read[field.name])[~masked].tolist() == pytest.approx(values)
    if ending != "csv":
        for field in FIELDS:
            assert read[field.name].description == field.meaning
            if field.unit:
                assert units.Unit(read[field.name].unit) == units.Unit(field.unit)


def test_iso_and_julian_dates_are_the_same_moments(report: NightReport) -> None:
    """Both are read by astropy as UTC, and they differ by no more than ISO's millisecond."""
    table = exposure_table(report)
    for name in ("start", "mid", "end"):
        iso = Time(list(table[f"{name}_utc"]), format="isot", scale="utc")
        julian = Time(table[f"{name}_jd"], format="jd", scale="utc")
        # A JD in one double is good to 40 microseconds.
        assert np.abs((iso - julian).sec).max() < 0.0011
    assert (table["end_jd"] >= table["start_jd"]).all()


def test_the_page_is_well_formed_and_stands_alone(report: NightReport) -> None:
    """Every tag is closed, every chart has its words, nothing comes from elsewhere, no script."""
    page = as_html(report)
    reader = Reader()
    reader.feed(page)
    reader.close()
    assert reader.open == []
    assert not re.search(r"(src|href|@import|url\()\s*[=(]", page)
    assert "<script" not in page
    assert page.count("<svg") == 5
    assert page.count("<title id=") == page.count("<desc id=") == 5
    for section in sections(report):
        assert f"<h2>{section.heading}</h2>" in page
    assert "nan" not in re.findall(r'[dxy]="[^"]*nan[^"]*"', page)


class Reader(HTMLParser):
    """Keeps the tags that are open; raises at one that closes another."""

    def __init__(self) -> None:
        super().__init__()
        self.open: list[str] = []

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Open a tag."""
        if tag not in VOID:
            self.open.append(tag)

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        """Pass over a tag without content."""

    def handle_endtag(self, tag: str) -> None:
        """Close the innermost tag."""
        assert self.open.pop() == tag


@given(st.text(max_size=80))
def test_nothing_an_observer_wrote_is_markdown(text: str) -> None:
    """It stays on its line and in its cell, and no character of it is taken for markup."""
    told = escaped(text)
    assert "\n" not in told
    assert not re.search(r"(?<!\\)(?:\\\\)*[`*_\[\]<>|#]", told)


def test_hostile_notes_are_shown_as_they_are(report: NightReport) -> None:
    """Markup in a note is text in every form."""
    text = "</td><script>alert('x')</script> | # *bold* & \"quoted\""
    note = Note(text=text, target="<b>").stamped(9999, report.exposures[0].start_mjd)
    hostile = replace(report, state=replace(report.state, notes=(note,)))
    page = as_html(hostile)
    assert "<script>" not in page
    assert "&lt;script&gt;" in page
    reader = Reader()
    reader.feed(page)
    assert reader.open == []
    (line,) = [line for line in as_markdown(hostile).splitlines() if "alert" in line]
    assert len(re.findall(r"(?<!\\)\|", line)) == 4
    assert json.loads(json.dumps(as_data(hostile)))["notes"][0]["text"] == text


def test_a_file_that_is_there_is_kept(report: NightReport, tmp_path: Path) -> None:
    """Nothing is ever replaced, an unknown ending is told, and a folder that is not there too."""
    path = tmp_path / "night.md"
    path.write_text("mine")
    with pytest.raises(WarmroomError, match="is there already"):
        save(report, path)
    assert path.read_text() == "mine"
    with pytest.raises(WarmroomError, match="ends in"):
        save(report, tmp_path / "night.pdf")
    with pytest.raises(WarmroomError, match="No such file"):
        save(report, tmp_path / "nowhere" / "night.md")


def test_a_night_that_is_damaged_or_open_is_told_as_far_as_it_goes(tmp_path: Path) -> None:
    """Half a log, and one without a header that can be read: both reported, both say so."""
    whole = (sample_logbook() / "2027-03-12.toml").read_bytes()
    path = tmp_path / "2027-03-12.toml"
    path.write_bytes(whole[: len(whole) // 2])
    half = night_report(path)
    assert half.is_open
    assert half.findings
    assert 0 < len(half.exposures) < len(night_report(sample_logbook() / path.name).exposures)
    assert "was not closed" in as_markdown(half)
    damaged = whole.replace(b"latitude_deg", b"lat@tude_deg", 1)
    path.write_bytes(damaged)
    without = night_report(path)
    assert without.site is None
    assert without.exposures
    assert "What was done" in as_html(without)


def test_a_night_with_nothing_in_it_has_a_report(tmp_path: Path) -> None:
    """A header alone: no chart, no table of exposures, no fault."""
    whole = (sample_logbook() / "2027-03-12.toml").read_bytes()
    path = tmp_path / "2027-03-12.toml"
    header = re.match(rb'.*?\n\[header\]\ncrc = "[0-9a-f]{8}"\n', whole, re.DOTALL)
    assert header is not None
    path.write_bytes(header[0])
    empty = night_report(path)
    assert not empty.exposures
    assert "<svg" not in as_html(empty)
    for ending in ("md", "html", "json", "csv", "ecsv", "vot"):
        save(empty, tmp_path / f"night.{ending}")


@given(
    st.floats(-1e6, 1e6, allow_nan=False),
    st.floats(1e-3, 1e6, allow_nan=False),
    st.integers(2, 8),
)
def test_scales_are_round_and_inside(least: float, room: float, about: int) -> None:
    """Round steps, none outside, neither none nor a crowd."""
    values = steps(least, least + room, about)
    assert 1 <= len(values) <= 2.5 * about + 2
    slack = 1e-6 * room
    assert all(least - slack <= value <= least + room + slack for value in values)
