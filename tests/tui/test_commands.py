"""The printing commands: their JSON as scripts rely on it, their exit status, their errors."""

from __future__ import annotations

import json
import os
import re
import shutil
import subprocess
import sys
import tomllib
from pathlib import Path
from typing import Any

import pytest

from engine.logbook import sample_logbook
from engine.times import mjd_from_iso
from tui.command import main

AT = "2027-03-25T12:00:00Z"
NIGHT = "2027-03-25"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a copy of the sample's two files, without its past nights."""
    folder = tmp_path / "nights"
    folder.mkdir()
    for name in ("observatory.toml", "targets.toml"):
        shutil.copy(sample_logbook() / name, folder)
    return folder


def run_json(capsys: pytest.CaptureFixture[str], *words: str) -> tuple[int, Any]:
    """Run a command with --json; return its status and what it printed."""
    status = main([*words, "--json"])
    return status, json.loads(capsys.readouterr().out)


def test_almanac_json(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Every key of the contract, ISO UTC or null, in the order of a night."""
    status, told = run_json(capsys, "almanac", "--logbook", str(folder), "--night", NIGHT)
    assert status == 0
    assert list(told) == [
        "night", "sunset", "civil_dusk", "nautical_dusk", "astronomical_dusk",
        "astronomical_dawn", "nautical_dawn", "civil_dawn", "sunrise", "moonrise", "moonset",
        "moon_illumination",
    ]  # fmt: skip
    assert told["night"] == NIGHT
    moments = [mjd_from_iso(told[name]) for name in list(told)[1:9]]
    assert moments == sorted(moments)
    assert 0.0 <= told["moon_illumination"] <= 1.0


def test_almanac_can_be_doubted(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Beside each time stands astroplan's; they agree to two seconds."""
    assert main(["almanac", "--logbook", str(folder), "--night", NIGHT, "--doubt"]) == 0
    apart_s = [
        abs(float(each))
        for each in re.findall(r"astroplan ([+-][\d.]+) s", capsys.readouterr().out)
    ]
    assert len(apart_s) == 10
    assert max(apart_s) < 2.0


def test_sky_json(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Every key of the contract for every target, null where there is no image."""
    status, told = run_json(capsys, "sky", "--logbook", str(folder), "--at", AT)
    assert status == 0
    assert list(told) == ["at", "mjd", "lst_h", "seeing_arcsec", "sun", "moon", "targets"]
    assert told["mjd"] == pytest.approx(mjd_from_iso(AT))
    assert set(told["sun"]) == {"altitude_deg", "azimuth_deg"}
    assert set(told["moon"]) == {"altitude_deg", "azimuth_deg", "illumination"}
    assert len(told["targets"]) == 62
    for target in told["targets"]:
        assert list(target) == [
            "name", "ra_deg", "dec_deg", "altitude_deg", "apparent_altitude_deg", "azimuth_deg",
            "hour_angle_h", "parallactic_angle_deg", "airmass", "moon_separation_deg",
            "observable", "reason", "filters",
        ]  # fmt: skip
        assert target["observable"] == (target["reason"] is None)
        up = target["airmass"] is not None
        assert up == (target["apparent_altitude_deg"] >= 0.0)
        for each in target["filters"]:
            assert list(each) == [
                "filter", "image_size_arcsec", "image_size_px", "elongation", "terms_arcsec",
                "sky_mag_arcsec2", "planned", "done", "credit",
            ]  # fmt: skip
            assert list(each["terms_arcsec"]) == [
                "atmosphere", "diffraction", "optics", "tracking", "dispersion", "sampling",
            ]  # fmt: skip
            assert (each["image_size_arcsec"] is not None) == up


def test_order_json(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Visits follow each other inside the span, their exposures inside them."""
    status, told = run_json(
        capsys, "order", "--logbook", str(folder), "--night", NIGHT, "--seeing", "1.4"
    )
    assert status == 0
    assert list(told) == [
        "from", "until", "value", "bound", "visits", "left_out", "compute_ms",
    ]  # fmt: skip
    assert told["bound"] is None
    assert told["value"] > 0.0
    before = mjd_from_iso(told["from"])
    for visit in told["visits"]:
        assert list(visit) == [
            "target", "start", "end", "exposures", "airmass_start", "airmass_end",
            "image_size_arcsec", "reason",
        ]  # fmt: skip
        start, end = mjd_from_iso(visit["start"]), mjd_from_iso(visit["end"])
        assert before <= start + 1e-6 < end
        before = end
        assert visit["reason"]
        for each in visit["exposures"]:
            assert list(each) == ["filter", "seconds", "count", "start"]
            assert start <= mjd_from_iso(each["start"]) < end
    assert before <= mjd_from_iso(told["until"]) + 1.5 / 1440.0
    assert all(each["reason"] for each in told["left_out"])


def test_exposure_json(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Longer reaches deeper; a brighter star has a better signal and saturates sooner."""
    words = ("exposure", "--logbook", str(folder), "--target", "M 67", "--at", AT)
    _, short = run_json(capsys, *words, "--filter", "V", "--seconds", "30")
    _, long = run_json(capsys, *words, "--filter", "V", "--seconds", "300")
    _, bright = run_json(capsys, *words, "--filter", "V", "--seconds", "30", "--magnitude", "8")
    short, long, bright = (told["filters"][0] for told in (short, long, bright))
    assert long["limiting_magnitude"] > short["limiting_magnitude"] + 1.0
    assert long["signal_to_noise"] > short["signal_to_noise"]
    assert bright["signal_to_noise"] > short["signal_to_noise"]
    assert bright["saturation_s"] < short["saturation_s"]


@pytest.mark.parametrize(
    ("words", "status", "said"),
    [
        (("sky", "--at", "2027-03-25T03:00:00Z"), 1, ""),
        (("order", "--at", "2027-03-25T22:00:00Z"), 1, "no darkness is left"),
        (("exposure", "--target", "M 76", "--at", AT), 1, "nearest is 'M 6"),
        (("exposure", "--target", "M 67", "--filter", "U", "--at", AT), 2, "B, V, I"),
        (("order", "--night", NIGHT, "--at", "2027-03-20T12:00:00Z"), 1, "not in the night of"),
        (("follow", "--json", "--night", NIGHT), 1, "nobody has opened this night"),
        (("report",), 1, "has no night yet"),
    ],
)
def test_no_is_an_answer(
    folder: Path,
    capsys: pytest.CaptureFixture[str],
    words: tuple[str, ...],
    status: int,
    said: str,
) -> None:
    """Status 1 where the answer is no, 2 for a fault in the input, one line on stderr."""
    assert main([*words, "--logbook", str(folder)]) == status
    told = capsys.readouterr()
    assert said in told.err
    assert "Traceback" not in told.err


def test_check_says_what_the_logbook_holds(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A sound logbook is described; a faulty one gives every fault and status 2."""
    assert main(["check", "--logbook", str(folder)]) == 0
    assert "targets: 62" in capsys.readouterr().out
    text = (folder / "observatory.toml").read_text()
    bad = text.replace("latitude_deg = -31.27", "latitude_deg = -131.27").replace(
        'mount = "german"', 'mounting = "german"'
    )
    (folder / "observatory.toml").write_text(bad)
    assert main(["check", "--logbook", str(folder)]) == 2
    lines = capsys.readouterr().err.splitlines()
    assert len(lines) == 3
    assert all(line.startswith(f"{folder / 'observatory.toml'}:") for line in lines)
    assert any("site.latitude_deg: -131.27" in line for line in lines)
    assert any("mounting: unknown key" in line and "'mount'" in line for line in lines)


def test_check_tells_every_key_of_the_files(capsys: pytest.CaptureFixture[str]) -> None:
    """Without any logbook: those of the sample's observatory are all among them."""
    assert main(["check", "--keys"]) == 0
    told = capsys.readouterr().out
    tables = tomllib.loads((sample_logbook() / "observatory.toml").read_text())
    for name, table in tables.items():
        head = f"[[{name}]]" if isinstance(table, list) else f"[{name}]"
        part = told.partition(f"observatory.toml {head}\n")[2].partition("\n\n")[0]
        for key in table[0] if isinstance(table, list) else table:
            assert f"\n  {key} " in part
    _, as_json = run_json(capsys, "check", "--keys")
    assert {"file", "table", "key", "unit", "expects", "default", "help"} == set(as_json["keys"][0])


def test_a_logbook_that_is_not_there(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Each command says so in a line."""
    for name in ("check", "almanac", "sky", "order"):
        assert main([name, "--logbook", str(tmp_path / "none")]) == 2
        assert "is missing, expected a file" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (("almanac", "--night", "9999-12-31"), "from 1900 to 2099"),
        (("almanac", "--night", "2027-02-30"), "expected a date such as"),
        (("sky", "--at", "0001-01-01T00:00:00Z"), "from 1900 to 2099"),
        (("sky", "--at", "2100-01-01T00:00:00Z"), "from 1900 to 2099"),
        (("sky", "--at", "0001-01-01T00:00:00+14:00"), "from 1900 to 2099"),
        (("sky", "--seeing", "nan"), "expected 0.1 to 20 arcsec"),
        (("order", "--seeing", "-1"), "expected 0.1 to 20 arcsec"),
        (("exposure", "--target", "M 67", "--seconds", "0"), "expected 0.001 to 86400 seconds"),
        (("exposure", "--target", "M 67", "--seconds", "inf"), "expected 0.001 to 86400 seconds"),
        (("exposure", "--target", "M 67", "--magnitude", "-1000"), "expected -30 to 40"),
        (("demo", "--unwatched", "--seed", "-1"), "expected a whole number"),
        (("demo", "--unwatched", "--pace", "0"), "expected 0.1 to 3600 seconds"),
    ],
)
def test_a_value_out_of_range_is_a_fault_of_the_input(
    capsys: pytest.CaptureFixture[str], words: tuple[str, ...], said: str
) -> None:
    """What was typed and what was expected, in one line behind the usage, status 2."""
    with pytest.raises(SystemExit) as left:
        main(words)
    assert left.value.code == 2
    assert said in capsys.readouterr().err.splitlines()[-1]


def test_a_terminal_without_unicode_gets_escapes(folder: Path) -> None:
    """The degree sign of a latitude is no reason to end with a traceback; JSON stays JSON."""
    plain = {**os.environ, "PYTHONIOENCODING": "ascii"}
    words = [sys.executable, "-m", "tui.command", "check", "--logbook", str(folder)]
    done = subprocess.run(words, env=plain, capture_output=True, text=True, check=True)
    assert "latitude -31.2700\\xb0" in done.stdout
    (folder / "targets.toml").write_text("[[target]]\nname = 'Körper'\n", encoding="utf-8")
    done = subprocess.run(
        [*words, "--json"], env=plain, capture_output=True, text=True, check=False
    )
    assert "Körper" in json.loads(done.stdout)["faults"][0]["key"]


def test_a_rehearsal_replaces_no_file(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    """Not a list of targets without an observatory, nor what is no folder at all."""
    (tmp_path / "targets.toml").write_text("# mine\n")
    assert main(["demo", "--unwatched", "--into", str(tmp_path)]) == 2
    assert "targets.toml: is there already" in capsys.readouterr().err
    assert (tmp_path / "targets.toml").read_text() == "# mine\n"
    assert main(["demo", "--unwatched", "--into", str(tmp_path / "targets.toml")]) == 2
    assert "expected a folder to write to" in capsys.readouterr().err


def test_a_report_is_printed_and_written(
    folder: Path, capsys: pytest.CaptureFixture[str], tmp_path: Path
) -> None:
    """The last night unless another is asked for; a file for every ending; status 1 for none."""
    for name in ("2027-03-10.toml", "2027-03-12.toml"):
        shutil.copy(sample_logbook() / name, folder)
    words = ["report", "--logbook", str(folder)]
    assert main(words) == 0
    assert "night of 2027-03-12" in capsys.readouterr().out
    status, told = run_json(capsys, *words, "--night", "2027-03-10")
    assert (status, told["night"]) == (0, "2027-03-10")
    assert sum(each["good"] for each in told["totals"]) > 100
    pages = [tmp_path / f"night.{ending}" for ending in ("html", "vot")]
    assert main([*words, *(f"--save={path}" for path in pages)]) == 0
    assert all(path.stat().st_size > 10_000 for path in pages)
    assert main([*words, f"--save={pages[0]}"]) == 2
    assert "is there already" in capsys.readouterr().err
    assert main([*words, "--night", "2027-03-11"]) == 1
    assert "the last one is 2027-03-12" in capsys.readouterr().err
