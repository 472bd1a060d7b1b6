"""Each kind of fault in the logbook's files, and the very line that is said of it."""

from __future__ import annotations

from pathlib import Path

import pytest

from engine.errors import LogbookFaults
from engine.logbook import load_logbook
from tests.engine.logbook_files import OBSERVATORY, TARGETS, as_told, written

RA = "hours 'hh:mm:ss.s', or degrees from 0 to less than 360"
DEC = "'+dd:mm:ss', or degrees from -90 to 90"
PLAN = '{ filter = "V", seconds = 60, count = 5 }, or V:60x5 in a table'
WINDOW = (
    "[2027-03-14T11:00:00Z, 2027-03-14T12:20:00Z], "
    "or 2027-03-14T11:00:00Z/2027-03-14T12:20:00Z in a table"
)

# What is replaced in the sound file, by what, and the lines that are then told.
IN_OBSERVATORY = {
    "out of range": (
        "latitude_deg = -31.27",
        "latitude_deg = -95",
        "3: site.latitude_deg: -95, expected degrees from -90 to 90",
    ),
    "nan": (
        "longitude_deg = 149.07",
        "longitude_deg = nan",
        "4: site.longitude_deg: nan, expected degrees from -180 to 360",
    ),
    "infinite": (
        "elevation_m = 1165.0",
        "elevation_m = inf",
        "5: site.elevation_m: inf, expected metres from -450 to 9000",
    ),
    "a number in quotes": (
        "elevation_m = 1165.0",
        'elevation_m = "1165"',
        "5: site.elevation_m: '1165' in quotes, expected metres from -450 to 9000",
    ),
    "true for a number": (
        "aperture_m = 0.80",
        "aperture_m = true",
        "11: telescope.aperture_m: true, expected metres, more than 0 and at most 50",
    ),
    "a number for text": ('"80 cm"', "80", "10: telescope.name: 80, expected text in quotes"),
    "no integer": (
        "columns = 2048",
        "columns = 2048.5",
        "25: camera.columns: 2048.5, expected a whole number from 1 to 200000",
    ),
    "less than": (
        "obstruction = 0.35",
        "obstruction = 0.95",
        "12: telescope.obstruction: 0.95, expected a number from 0 to less than 0.95",
    ),
    "one of few": (
        '"german"',
        '"germane"',
        "14: telescope.mount: 'germane', expected one of 'german', 'fork', 'altazimuth', "
        "nearest is 'german'",
    ),
    "unknown key": (
        "settle_s",
        "settling_s",
        "19: telescope.settling_s: unknown key, expected one of the 13 known ones, "
        "nearest is 'settle_s'",
        "9: telescope.settle_s: is missing, expected seconds from 0 to 3600 "
        "(time to settle after a slew)",
    ),
    "unknown table": (
        "[seeing]",
        "[seing]",
        "1: seeing: is missing, expected a table",
        "48: seing: unknown key, expected one of site, telescope, camera, filter, seeing, caution, "
        "nearest is 'seeing'",
    ),
    "unknown, and nothing near": (
        "[seeing]\n",
        "[seeing]\nxyzzy = 1\n",
        "49: seeing.xyzzy: unknown key, expected one of typical_arcsec, outer_scale_m",
    ),
    "missing key": (
        "readout_s = 8.0\n",
        "",
        "23: camera.readout_s: is missing, expected seconds from 0 to 3600 "
        "(time to read one exposure out)",
    ),
    "no table but a value": (
        "[site]\n",
        "caution = 1\n[site]\n",
        "1: caution: 1, expected a table",
    ),
    "time zone": (
        "Australia/Sydney",
        "Australia/Sidney",
        "6: site.timezone: 'Australia/Sidney', expected an IANA time zone such as 'Europe/Madrid', "
        "nearest is 'Australia/Sydney'",
    ),
    "horizon out of order": (
        "[90, 25], [180, 12]",
        "[180, 25], [90, 12], [360, 5], [200, 91], [1], [180, 25]",
        "7: site.horizon[3]: azimuth 90 after 180, expected azimuths that rise",
        "7: site.horizon[7]: azimuth 180 after 180, expected azimuths that rise",
        "7: site.horizon[4]: azimuth 360, expected degrees from 0 to less than 360",
        "7: site.horizon[5]: altitude 91, expected degrees from 0 to 90",
        "7: site.horizon[6]: [1], expected a pair [azimuth_deg, altitude_deg]",
    ),
    "horizon of one number": (
        "[[0, 18], [90, 25], [180, 12]]",
        "20",
        "7: site.horizon: 20, expected at most 1000 pairs [azimuth_deg, altitude_deg]",
    ),
    "hour angles that fall": (
        "[-6.0, 6.0]",
        "[6.0, -6.0]",
        "17: telescope.hour_angle_limits_h: [6.0, -6.0], "
        "expected a rising pair of hours from -12 to 12",
    ),
    "no room between altitudes": (
        "minimum_altitude_deg = 20.0",
        "minimum_altitude_deg = 88",
        "15: telescope.minimum_altitude_deg: 88, expected less than maximum_altitude_deg, 88",
    ),
    "two filters of a name": (
        "[seeing]",
        '[[filter]]\nname = "B"\nwavelength_nm = 400.0\nwidth_nm = 9.0\nextinction_mag = 0.2\n'
        "zero_point_mag = 22.0\ndark_sky_mag = 22.0\n[seeing]",
        "49: filter['B'].name: 'B' is filter 1 already, expected each name once",
    ),
    "a filter's key": (
        "width_nm = 85.0",
        "width_nm = 0",
        "43: filter['V'].width_nm: 0, expected nanometres, more than 0 and at most 800",
    ),
    "an empty name": (
        '"Testing Hill"',
        '""',
        "2: site.name: an empty text, expected at least one character",
    ),
    "a name no terminal should see": (
        "Testing Hill",
        "Testing\\u001b[2JHill",
        "2: site.name: 'Testing\\x1b[2JHill', expected no control or invisible characters",
    ),
    "blanks round a name": (
        '"80 cm"',
        '" 80 cm"',
        "10: telescope.name: ' 80 cm', expected no blanks at either end",
    ),
    "syntax": (
        "latitude_deg = -31.27",
        "latitude_deg = 31° S",
        "3: expected newline or end of document after a statement",
    ),
    "text without quotes": (
        '"german"',
        "german",
        "14: no value of TOML, expected text in quotes, a number or a list",
    ),
    "a key twice": (
        "rows = 2048",
        "columns = 2048",
        "26: this key is given already, expected it once",
    ),
    "a table twice": ("[seeing]", "[site]", "48: 'site' is given already, expected it once"),
    "quotes left open": (
        '"80 cm"',
        '"80 cm',
        "10: text in quotes is not closed on its line, expected a closing quote",
    ),
}

IN_TARGETS = {
    "impossible coordinates": (
        '"08:51:18"\ndec = "+11:48:00"',
        '"28:51:18"\ndec = "+91:48:00"',
        f"8: target['M 67'].ra: '28:51:18', expected {RA}",
        f"9: target['M 67'].dec: '+91:48:00', expected {DEC}",
    ),
    "degrees out of range": (
        "ra = 103.02\ndec = -0.33",
        "ra = 360\ndec = -90.01",
        f"20: target['SA 98'].ra: 360, expected {RA}",
        f"21: target['SA 98'].dec: -90.01, expected {DEC}",
    ),
    "sixty seconds": (
        '"08:51:18"',
        '"08:51:60"',
        f"8: target['M 67'].ra: '08:51:60', expected {RA}",
    ),
    "filter that is not there": (
        'filter = "V", seconds = 60',
        'filter = "v", seconds = 60',
        "14: target['M 67'].exposures[2].filter: 'v' is not in the wheel, expected one of 'B', 'V'",
    ),
    "an exposure's keys": (
        "seconds = 60, count = 5",
        "seconds = 0, number = 5",
        "14: target['M 67'].exposures[2].count: is missing, "
        "expected a whole number from 1 to 100000 (how many)",
        "14: target['M 67'].exposures[2].number: unknown key, expected one of filter, seconds, "
        "count",
        "14: target['M 67'].exposures[2].seconds: 0, expected seconds, more than 0 and at most "
        "86400",
    ),
    "a plan that is no list": (
        '[{ filter = "V", seconds = 10, count = 3 }]',
        '"V:10x3"',
        f"22: target['SA 98'].exposures: 'V:10x3', expected a list of {PLAN}",
    ),
    "an empty plan": (
        '[{ filter = "V", seconds = 10, count = 3 }]',
        "[]",
        f"22: target['SA 98'].exposures: an empty list, expected a list of {PLAN}",
    ),
    "an exposure that is no table": (
        '[{ filter = "V", seconds = 10, count = 3 }]',
        '["V"]',
        f"22: target['SA 98'].exposures[1]: 'V', expected {PLAN}",
    ),
    "window backwards": (
        "12:20:00Z]",
        "10:20:00Z]",
        "16: target['M 67'].windows[1]: ends at 2027-03-25T10:20:00Z, "
        "expected later than its begin",
    ),
    "window of no length": (
        "12:20:00Z]",
        "11:00:00Z]",
        "16: target['M 67'].windows[1]: ends at 2027-03-25T11:00:00Z, "
        "expected later than its begin",
    ),
    "window without a zone": (
        "12:20:00Z]",
        "12:20:00]",
        "16: target['M 67'].windows[1]: 2027-03-25T12:20:00 has no time zone, "
        "expected UTC with a Z at its end",
    ),
    "window of dates": (
        "2027-03-25T11:00:00Z, 2027-03-25T12:20:00Z",
        "2027-03-25, 2027-03-26",
        f"16: target['M 67'].windows[1]: [2027-03-25, 2027-03-26], expected {WINDOW}",
    ),
    "no such day": (
        "2027-03-25T11:00:00Z",
        "2027-02-30T11:00:00Z",
        "16: no such date, expected one such as 2027-03-14T11:00:00Z",
    ),
    "undeclared programme": (
        'programme = "Clusters"',
        'programme = "Cluster"',
        "7: target['M 67'].programme: 'Cluster' is no [[programme]], expected one of 'Clusters', "
        "nearest is 'Clusters'",
    ),
    "priority": (
        "priority = 5",
        "priority = 5.5",
        "11: target['M 67'].priority: 5.5, expected a whole number from 1 to 5",
    ),
    "the same name twice": (
        '"SA 98"',
        '"M 67"',
        "19: target['M 67'].name: 'M 67' stands at targets.toml:6, expected each name once",
    ),
    "no name": (
        'name = "SA 98"\n',
        "",
        "18: target[2].name: is missing, expected text in quotes (the target's name; "
        "each name once)",
    ),
    "the models' own names": (
        "ra = 103.02",
        "ra_deg = 103.02",
        "18: target['SA 98'].ra: is missing, expected " + RA + " (right ascension, ICRS)",
        "20: target['SA 98'].ra_deg: unknown key, expected one of the 20 known ones, "
        "nearest is 'ra'",
    ),
    "an unknown list": (
        "[[programme]]",
        "[[program]]",
        "1: program: unknown key, expected one of programme, target, nearest is 'programme'",
    ),
    "a table for a list": (
        "[[programme]]",
        "[programme]",
        "1: programme: a table, expected a list of tables, [[programme]]",
    ),
    "several faults of one target": (
        'programme = "Clusters"\nra = "08:51:18"',
        'programme = "Nebulae"\nra = "8h51m"',
        "7: target['M 67'].programme: 'Nebulae' is no [[programme]], expected one of 'Clusters'",
        f"8: target['M 67'].ra: '8h51m', expected {RA}",
    ),
    "a list left open": (
        "count = 3 }]",
        "count = 3 }",
        "23: a list is not closed, expected ]",
    ),
}


def told(folder: Path) -> list[str]:
    """Return the lines told of the logbook in a folder, each once, with the folder cut off."""
    with pytest.raises(LogbookFaults) as caught:
        load_logbook(folder)
    lines = as_told(folder, str(caught.value))
    assert len(lines) == len(caught.value.faults) == len(set(lines))
    return lines


@pytest.mark.parametrize("kind", IN_OBSERVATORY)
def test_a_fault_in_the_observatory(kind: str, tmp_path: Path) -> None:
    """The lines are told, in order, and no other."""
    before, after, *lines = IN_OBSERVATORY[kind]
    text = OBSERVATORY.replace(before, after, 1)
    assert text != OBSERVATORY
    written(tmp_path, {"observatory.toml": text})
    assert sorted(told(tmp_path)) == sorted(f"observatory.toml:{line}" for line in lines)


@pytest.mark.parametrize("kind", IN_TARGETS)
def test_a_fault_in_the_targets(kind: str, tmp_path: Path) -> None:
    """The lines are told, in order, and no other."""
    before, after, *lines = IN_TARGETS[kind]
    text = TARGETS.replace(before, after, 1)
    assert text != TARGETS
    written(tmp_path, {"targets.toml": text})
    assert sorted(told(tmp_path)) == sorted(f"targets.toml:{line}" for line in lines)


def test_the_nearest_filter_is_named(tmp_path: Path) -> None:
    """A name that is nearly one in the wheel."""
    longer = OBSERVATORY.replace('name = "V"', 'name = "V wide"')
    written(
        tmp_path, {"observatory.toml": longer, "targets.toml": TARGETS.replace('"V"', '"V-wide"')}
    )
    assert told(tmp_path) == [
        f"targets.toml:{line}: target['{name}'].exposures[{place}].filter: 'V-wide' is not in the "
        "wheel, expected one of 'B', 'V wide', nearest is 'V wide'"
        for line, name, place in ((14, "M 67", 2), (22, "SA 98", 1))
    ]


def test_all_files_are_told_at_once(tmp_path: Path) -> None:
    """Faults of every file, and names across all of them: in the order of files and lines."""
    spare = TARGETS.replace("[[programme]]", "[[programme]]\n# another list\n")
    written(
        tmp_path,
        {
            "observatory.toml": OBSERVATORY.replace("-31.27", "-131.27"),
            "targets/b.toml": spare,
            "targets/a.csv": "name,ra,dec,exposures\nM 67,1,2,U:10x1\n",
            "targets/.hidden.toml": "no TOML",
            "targets/notes.txt": "no TOML either",
        },
    )
    once = "expected each name once"
    assert told(tmp_path) == [
        "observatory.toml:3: site.latitude_deg: -131.27, expected degrees from -90 to 90",
        "targets/a.csv:2: target['M 67'].exposures[1].filter: 'U' is not in the wheel, "
        "expected one of 'B', 'V'",
        f"targets/a.csv:2: target['M 67'].name: 'M 67' stands at targets.toml:6, {once}",
        "targets/b.toml:4: programme['Clusters'].name: 'Clusters' stands at targets.toml:2, "
        f"{once}",
        f"targets/b.toml:8: target['M 67'].name: 'M 67' stands at targets.toml:6, {once}",
        f"targets/b.toml:21: target['SA 98'].name: 'SA 98' stands at targets.toml:19, {once}",
    ]


def test_one_name_in_two_spellings_of_unicode(tmp_path: Path) -> None:
    """What looks the same is the same."""
    text = TARGETS.replace("M 67", "Pr\u00e9").replace("SA 98", "Pre\u0301")
    written(tmp_path, {"targets.toml": text})
    assert told(tmp_path) == [
        "targets.toml:19: target['Pre\u0301'].name: 'Pr\u00e9' stands at targets.toml:6, "
        "expected each name once"
    ]


def test_no_programme_is_asked_for_where_none_is_declared(tmp_path: Path) -> None:
    """A programme's name is then a label like any other."""
    text = TARGETS.split("\n\n", 1)[1]
    assert len(load_logbook(written(tmp_path, {"targets.toml": text})).targets) == 2


def test_a_file_of_nothing_but_faults_is_told_in_part(tmp_path: Path) -> None:
    """Some hundred lines are read by nobody: the last says that there may be more."""
    written(tmp_path, {"targets.toml": "[[target]]\n" * 1000})
    lines = told(tmp_path)
    assert len(lines) == 201
    assert sum("only 200 faults of a file are told" in line for line in lines) == 1


TABLES = {
    "unknown and missing columns": (
        "name,ra_deg,dec,exposures\nA,1,2,V:1x1\nB,1,200,V:1x1\n",
        "1: ra: no such column, expected one (right ascension, ICRS)",
        "1: ra_deg: unknown key, expected one of the 20 known ones, nearest is 'ra'",
        f"3: target['B'].dec: 200, expected {DEC}",
    ),
    "cells": (
        'name,ra,dec,exposures,windows,priority\n"A\nB",1,2,V:1x1,,\nC,x,nan,V1,2027,2.5\n\nD,1,2,,,\n',
        "2: target['A\\nB'].name: 'A\\nB', expected no control or invisible characters",
        f"4: target['C'].dec: nan, expected {DEC}",
        f"4: target['C'].exposures[1]: 'V1', expected {PLAN}",
        "4: target['C'].priority: 2.5, expected a whole number from 1 to 5",
        f"4: target['C'].ra: 'x', expected {RA}",
        f"4: target['C'].windows[1]: '2027', expected {WINDOW}",
        f"6: target['D'].exposures: is missing, expected a list of {PLAN} "
        "(the plan, in the order in which it is taken)",
    ),
    "too many cells": (
        "name,ra,dec,exposures\nA,1,2,V:1x1,5\n",
        "2: 5 cells, expected 4 as in the head",
    ),
    "other separators": (
        "name;ra;dec;exposures\nA;1;2;V:1x1\n",
        "1: cells apart by ';', expected commas",
    ),
}


@pytest.mark.parametrize("kind", TABLES)
def test_a_fault_in_a_table(kind: str, tmp_path: Path) -> None:
    """A column's fault on the line of the head, a cell's on the line where its row begins."""
    text, *lines = TABLES[kind]
    written(tmp_path, {"targets.csv": text})
    assert told(tmp_path) == [f"targets.csv:{line}" for line in lines]


def test_a_unit_that_can_not_be_turned(tmp_path: Path) -> None:
    """Hours of time are no angle, and numbers in them are not taken for degrees."""
    text = (
        "# %ECSV 1.0\n# ---\n# datatype:\n# - {name: name, datatype: string}\n"
        "# - {name: ra, unit: h, datatype: float64}\n"
        "# - {name: dec, unit: deg, datatype: float64}\n"
        "# - {name: exposures, datatype: string}\n# schema: astropy-2.0\n"
        "name ra dec exposures\nA 5.5 2 V:1x1\nB 5.5 -99 V:1x1\n"
    )
    written(tmp_path, {"targets.ecsv": text})
    assert told(tmp_path) == [
        f"targets.ecsv:9: ra: in 'h', expected {RA}",
        f"targets.ecsv:11: target['B'].dec: -99.0, expected {DEC}",
    ]
