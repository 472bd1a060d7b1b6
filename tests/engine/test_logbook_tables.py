"""Targets from tables: the same as from TOML, in each form; units, empty cells, plain text."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path
from typing import Any

import pytest
from astropy import units as u
from astropy.table import MaskedColumn, Table

from engine.logbook import Logbook, Target, load_logbook, sample_logbook
from engine.logbook.faults import field_key
from tests.engine.logbook_files import written


def cell(value: Any) -> Any:
    """Return a target's value as a table holds it; None for an empty cell."""
    if not isinstance(value, tuple):
        return None if value == "" else value
    parts = [
        f"{each[0].isoformat()}/{each[1].isoformat()}".replace("+00:00", "Z")
        if isinstance(each, tuple)
        else f"{each.filter}:{each.seconds:g}x{each.count}"
        for each in value
    ]
    return " ".join(parts) or None


def as_table(targets: tuple[Target, ...]) -> Table:
    """Return targets as a table whose cells are masked where a target leaves a key out."""
    table = Table()
    for name, field in Target.model_fields.items():
        cells = [cell(getattr(target, name)) for target in targets]
        kind: Any = str if any(isinstance(each, str) for each in cells) else float
        kind = int if name == "priority" else kind
        filled = [kind() if each is None else kind(each) for each in cells]
        mask = [each is None for each in cells]
        table[field_key(name, field)] = MaskedColumn(filled, mask=mask)
    return table


@pytest.fixture(scope="module")
def sample() -> Logbook:
    """Return the sample logbook."""
    return load_logbook(sample_logbook())


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    """Return a folder with the sample's observatory and no target yet."""
    text = (sample_logbook() / "targets.toml").read_text()
    written(tmp_path, {"targets.toml": text.split("[[target]]")[0]}, sound=False)
    (tmp_path / "observatory.toml").write_bytes(
        (sample_logbook() / "observatory.toml").read_bytes()
    )
    return tmp_path


@pytest.mark.parametrize(
    ("ending", "form"), [("csv", "ascii.csv"), ("ecsv", "ascii.ecsv"), ("vot", "votable")]
)
@pytest.mark.parametrize("name", ["targets.{}", "targets/more.{}"])
def test_a_table_of_the_sample_is_the_sample(
    ending: str, form: str, name: str, folder: Path, sample: Logbook
) -> None:
    """Every key of every target comes back, whichever form it took."""
    path = folder / name.format(ending)
    path.parent.mkdir(exist_ok=True)
    as_table(sample.targets).write(path, format=form)
    again = load_logbook(folder)
    assert again.targets == sample.targets
    assert again.programmes == sample.programmes


def test_cells_of_a_csv_are_text_first(folder: Path) -> None:
    """A name may be a number, coordinates either; an empty or blank cell is a key left out."""
    written(
        folder,
        {
            "targets.csv": "name,ra,dec,exposures,priority,magnitude,role\n"
            "007,05:34:31.9,-22:00:52,B:120x5 V:7.5x2,,  ,standard\n"
            '"8, near the pole",83,-89.5,V:60x1,4,12\n',
        },
        sound=False,
    )
    first, second = load_logbook(folder).targets
    assert (first.name, first.role, first.priority, first.magnitude) == ("007", "standard", 3, None)
    assert first.ra_deg == pytest.approx(15.0 * (5 + 34 / 60 + 31.9 / 3600))
    assert [(e.filter, e.seconds, e.count) for e in first.exposures] == [
        ("B", 120.0, 5),
        ("V", 7.5, 2),
    ]
    assert (second.name, second.ra_deg, second.dec_deg) == ("8, near the pole", 83.0, -89.5)
    assert (second.priority, second.magnitude, second.role) == (4, 12.0, "science")


@pytest.mark.parametrize(("ending", "form"), [("ecsv", "ascii.ecsv"), ("vot", "votable")])
def test_units_of_columns_are_turned_into_the_keys_own(
    ending: str, form: str, folder: Path
) -> None:
    """Radians and arcseconds a year are not taken for degrees and milliarcseconds a year."""
    table = Table(
        {
            "name": ["A", "B"],
            "ra": [1.0, 2.0] * u.rad,
            "dec": [-0.5, 0.25] * u.rad,
            "pm_ra_mas_per_yr": [0.5, -1.25] * u.arcsec / u.yr,
            "magnitude": [11.5, 12.5] * u.mag,
            "exposures": ["V:60x5", "B:60x5"],
        }
    )
    table.write(folder / f"targets.{ending}", format=form)
    first, second = load_logbook(folder).targets
    assert first.ra_deg == pytest.approx(57.29577951308232)  # 180 / pi
    assert second.dec_deg == pytest.approx(0.25 * 57.29577951308232)
    assert (first.pm_ra_mas_per_yr, second.pm_ra_mas_per_yr) == pytest.approx((500.0, -1250.0))
    assert (first.magnitude, second.magnitude) == (11.5, 12.5)


def test_a_packed_votable_is_read(folder: Path, sample: Logbook) -> None:
    """BINARY2 rows in the file itself."""
    as_table(sample.targets).write(
        folder / "targets.vot", format="votable", tabledata_format="binary2"
    )
    assert load_logbook(folder).targets == sample.targets


def test_astropy_is_loaded_for_tables_alone(folder: Path) -> None:
    """Start-up waits for pydantic at most: astropy comes with the first table."""
    (folder / "targets.csv").write_text("name,ra,dec,exposures\nA,1,2,V:60x5\n")
    code = """
import sys
from pathlib import Path
from engine.logbook import load_logbook, sample_logbook
load_logbook(sample_logbook())
assert not {"astropy", "numpy"} & set(sys.modules)
assert len(load_logbook(Path(sys.argv[1])).targets) == 1
assert "astropy" in sys.modules
"""
    done = subprocess.run(
        [sys.executable, "-c", code, str(folder)], capture_output=True, text=True, check=False
    )
    assert done.returncode == 0, done.stderr
