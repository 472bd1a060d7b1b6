"""A sound logbook as it is read: defaults, order, what it says of itself, the sample."""

from __future__ import annotations

import dataclasses
from datetime import UTC, date, datetime
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from engine.errors import LogbookFaults
from engine.logbook import (
    Observatory,
    PlannedExposures,
    Target,
    describe,
    load_logbook,
    planned_hours,
    reference_rows,
    sample_logbook,
)
from engine.logbook.faults import field_key
from engine.logbook.targets import parse_angle
from engine.logbook.text import NAME_LENGTH, SHOWN, nearest, shown, visible
from engine.times import mjd_from_iso
from tests.engine.logbook_files import OBSERVATORY, TARGETS, written


def test_what_is_left_out_has_its_documented_value(tmp_path: Path) -> None:
    """The optional keys of the contract."""
    logbook = load_logbook(written(tmp_path))
    observatory, target = logbook.observatory, logbook.targets[1]
    assert observatory.camera.dark_e_per_s == 0.0
    assert observatory.filters[0].change_s == 0.0
    assert observatory.seeing.outer_scale_m is None
    assert observatory.caution.sun_separation_deg == 30.0
    assert (target.priority, target.programme, target.windows) == (3, "", ())
    assert (target.pm_ra_mas_per_yr, target.epoch_yr) == (0.0, 2000.0)
    assert target.maximum_airmass is None
    short = written(tmp_path / "short", {"targets.toml": TARGETS})
    text = (short / "observatory.toml").read_text()
    for line in ("horizon =", "maximum_altitude_deg =", "hour_angle_limits_h ="):
        text = "\n".join(each for each in text.split("\n") if not each.startswith(line))
    (short / "observatory.toml").write_text(text)
    observatory = load_logbook(short).observatory
    assert observatory.site.horizon == ()
    assert observatory.telescope.maximum_altitude_deg == 90.0
    assert observatory.telescope.hour_angle_limits_h == (-12.0, 12.0)


def test_values_in_their_units(tmp_path: Path) -> None:
    """Hours become degrees, date-times MJDs, micrometres and metres arcseconds a pixel."""
    logbook = load_logbook(written(tmp_path))
    target = logbook.targets[0]
    assert target.ra_deg == pytest.approx(15.0 * (8 + 51 / 60 + 18 / 3600))
    assert target.dec_deg == pytest.approx(11.8)
    assert target.windows_mjd == (
        (mjd_from_iso("2027-03-25T11:00:00Z"), mjd_from_iso("2027-03-25T12:20:00Z")),
    )
    assert logbook.observatory.pixel_arcsec == pytest.approx(0.331497, abs=1e-6)  # 9 um at 5.6 m
    assert logbook.observatory.filter_named("V").wavelength_nm == 545.0
    assert logbook.observatory.filter_index("V") == 1
    with pytest.raises(KeyError):
        logbook.observatory.filter_index("U")


@pytest.mark.parametrize(
    ("latitude_deg", "longitude_deg", "zone", "is_sound"),
    [
        (19.8, -155.5, "Pacific/Honolulu", True),
        (19.8, -155.5, "UTC", False),  # its nights would be parted at two in the morning
        (32.0, 111.6, "America/Phoenix", False),  # west positive
        (38.3, 74.9, "Asia/Shanghai", True),  # three hours, the most that people live by
        (1.9, -157.4, "Pacific/Kiritimati", True),  # beyond the date line
        (28.8, 342.1, "Atlantic/Canary", True),  # west of Greenwich, counted east
        (-90.0, 0.0, "Pacific/Auckland", True),  # at the pole every longitude is as good
    ],
)
def test_the_zone_must_be_of_the_site(
    tmp_path: Path, latitude_deg: float, longitude_deg: float, zone: str, is_sound: bool
) -> None:
    """Nights are parted at the zone's noon, so that may not fall into one."""
    text = OBSERVATORY.replace("-31.27", f"{latitude_deg}").replace("149.07", f"{longitude_deg}")
    folder = written(tmp_path, {"observatory.toml": text.replace("Australia/Sydney", zone)})
    if is_sound:
        assert load_logbook(folder).observatory.site.timezone == zone
        return
    with pytest.raises(LogbookFaults) as told:
        load_logbook(folder)
    (fault,) = told.value.faults
    assert (fault.key, fault.line) == ("site.timezone", 6)
    assert f"'{zone}' is" in fault.what


def test_targets_of_several_files_in_order(tmp_path: Path) -> None:
    """targets.toml first, its neighbours, then the folder by name; endings in either case."""
    one = "name,ra,dec,exposures\n{},1,2,V:60x1\n"
    written(
        tmp_path,
        {
            "targets.csv": one.format("A"),
            "targets/b.CSV": one.format("B"),
            "targets/a.toml": TARGETS.split("\n\n", 1)[1]
            .replace("M 67", "C")
            .replace("SA 98", "D"),
        },
    )
    names = [target.name for target in load_logbook(tmp_path).targets]
    assert names == ["M 67", "SA 98", "A", "C", "D", "B"]


def test_a_logbook_does_not_change(tmp_path: Path) -> None:
    """What was read stays as it was read."""
    logbook = load_logbook(written(tmp_path))
    with pytest.raises(dataclasses.FrozenInstanceError):
        logbook.targets = ()  # type: ignore[misc]


def test_what_a_logbook_holds(tmp_path: Path) -> None:
    """Site, telescope, camera, filters, and what each programme asks for."""
    logbook = load_logbook(written(tmp_path))
    # 5 x (90 + 60) s, and 3 x 10 s.
    assert planned_hours(logbook.targets) == pytest.approx(780.0 / 3600.0)
    assert describe(logbook) == [
        "Testing Hill: latitude -31.2700°, longitude +149.0700°, 1165 m, Australia/Sydney",
        "80 cm: 0.8 m aperture, 5.6 m focal length, german mount",
        "camera: 0.331 arcsec a pixel, 11.3 x 11.3 arcmin",
        "filters: B 438 nm, V 545 nm",
        "seeing: 1.6 arcsec until something is measured",
        "targets: 2, asking for 0.2 h",
        "  Clusters (R. Okonjo): 1 target, 0.2 h",
        "  no programme: 1 target, 1 of them standard, 0.0 h",
    ]


def test_every_key_has_a_row_in_the_reference() -> None:
    """One row a key, with help; every number says what range it may have."""
    rows = {(row.table, row.key): row for row in reference_rows()}
    assert len(rows) == len(reference_rows())
    assert all(row.help and row.expects and row.default for row in rows.values())
    for name, field in Target.model_fields.items():
        assert ("[[target]]", field_key(name, field)) in rows
    for name in PlannedExposures.model_fields:
        assert ("[[target]] exposures", name) in rows
    tables = {row.table for row in rows.values()}
    for name, field in Observatory.model_fields.items():
        key = field_key(name, field)
        assert {f"[{key}]", f"[[{key}]]"} & tables
    latitude = rows["[site]", "latitude_deg"]
    assert (latitude.unit, latitude.default) == ("deg", "required")
    assert latitude.expects == "degrees from -90 to 90"
    assert rows["[[target]]", "priority"].default == "3"
    assert rows["[telescope]", "hour_angle_limits_h"].default == "[-12.0, 12.0]"
    assert rows["[seeing]", "outer_scale_m"].default == "none"


def test_the_sample_shows_every_key() -> None:
    """Each optional key of a target at least once, standards, targets all round the sky."""
    logbook = load_logbook(sample_logbook())
    targets = logbook.targets
    for name, field in Target.model_fields.items():
        given_somewhere = {getattr(target, name) for target in targets} - {field.default}
        text = (sample_logbook() / "targets.toml").read_text()
        assert given_somewhere or f"\n{name} = " in text, name
    assert len(logbook.programmes) == 3
    assert len(targets) >= 44
    assert {target.priority for target in targets} == {1, 2, 3, 4, 5}
    assert sum(target.role == "standard" for target in targets) >= 5
    assert {int(target.ra_deg // 45) for target in targets} == set(range(8))
    assert {each.name for each in logbook.observatory.filters} == {"B", "V", "R", "I", "Ha"}
    assert {each.filter for target in targets for each in target.exposures} >= {"B", "V", "I", "Ha"}


@given(st.integers(-89, 89), st.integers(0, 59), st.integers(0, 59), st.sampled_from(": "))
def test_an_angle_is_read_as_it_is_written(whole: int, minutes: int, seconds: int, by: str) -> None:
    """The sign belongs to the whole angle, also to one less than a degree."""
    sign = "-" if whole < 0 else "+"
    text = f"{sign}{abs(whole):02d}{by}{minutes:02d}{by}{seconds:02d}"
    size = abs(whole) + minutes / 60.0 + seconds / 3600.0
    assert parse_angle(text) == pytest.approx(-size if whole < 0 else size, abs=1e-12)
    assert parse_angle(f"-00{by}30") == -0.5


@given(st.text() | st.integers() | st.binary() | st.lists(st.text(max_size=3), max_size=5))
def test_any_value_is_shown_on_one_short_line(value: object) -> None:
    """Nothing that a terminal obeys, and not much longer than a line."""
    text = shown(value)
    assert text == visible(text)
    assert "\n" not in text
    assert len(text) <= SHOWN + 5


@pytest.mark.parametrize(
    ("value", "text"),
    [
        ("x" * 200, f"'{'x' * SHOWN}...'"),
        ("\x1b" * 200, f"'{(chr(92) + 'x1b') * (SHOWN // 4)}...'"),
        (True, "true"),
        (-0.5, "-0.5"),
        (10**70, "a number of 71 digits or so"),
        ({"a": 1}, "a table"),
        ([1, [2], 3], "[1, [...], and so on]"),
        (datetime(2027, 3, 25, 11, tzinfo=UTC), "2027-03-25T11:00:00Z"),
        (date(2027, 3, 25), "2027-03-25"),
    ],
)
def test_a_value_as_it_is_shown(value: object, text: str) -> None:
    """As the file writes it where that is short, in words where it is not."""
    assert shown(value) == text


def test_names_are_kept_in_one_spelling_of_unicode(tmp_path: Path) -> None:
    """A programme and the target that names it agree, however either was typed."""
    text = TARGETS.replace('name = "Clusters"', 'name = "Pr\u00e9"').replace(
        'programme = "Clusters"', 'programme = "Pre\u0301"'
    )
    logbook = load_logbook(written(tmp_path, {"targets.toml": text}))
    assert logbook.targets[0].programme == logbook.programmes[0].name == "Pr\u00e9"


def test_nearest_takes_its_time_from_nobody() -> None:
    """The best of the known names, none when nothing is like it, and no waiting for long ones."""
    assert nearest("Vband", ["B", "V band", "R"]) == ", nearest is 'V band'"
    assert nearest("xyz", ["B", "V", "R"]) == ""
    assert nearest("k" * 10**6, ["k" * 10**6, "k" * NAME_LENGTH]).startswith(", nearest is 'kk")
