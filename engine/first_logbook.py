"""A first logbook, written from a few answers: commented, sound, and honest about what it guesses.

What nobody was asked stands there with a usual value and the words "a guess": it works tonight and
is there to be put right.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from zoneinfo import available_timezones

import tomli_w

from engine.errors import LogbookFaults, WarmroomError
from engine.light.photometry import vega_photons_per_s_m2_nm
from engine.logbook.load import load_logbook
from engine.logbook.targets import Target

# Bands as they are usually sold: wavelength and width (nm), extinction (mag per airmass) of a fair
# site, dark sky (mag per square arcsecond). From memory; common practice, no source.
BANDS: dict[str, tuple[float, float, float, float]] = {
    "U": (365.0, 65.0, 0.50, 22.0),
    "B": (438.0, 90.0, 0.25, 22.5),
    "V": (545.0, 85.0, 0.15, 21.6),
    "R": (641.0, 150.0, 0.10, 20.9),
    "I": (798.0, 150.0, 0.06, 19.6),
    "g": (477.0, 135.0, 0.18, 22.0),
    "r": (623.0, 135.0, 0.10, 21.0),
    "i": (763.0, 130.0, 0.05, 20.0),
    "z": (905.0, 110.0, 0.05, 19.0),
    "L": (550.0, 300.0, 0.16, 21.5),
    "Ha": (656.3, 5.0, 0.10, 20.9),
    "OIII": (500.7, 5.0, 0.17, 21.8),
}
# The share of Vega's photons above the air that end as electrons: common practice, no source.
THROUGHPUT = 0.4


@dataclass(frozen=True, slots=True)
class Question:
    """One question: what is asked for, an answer to show or take, and how an answer is read.

    ``read`` returns what the answer says, as keys of the files; ValueError says what was expected.
    """

    asks: str
    example: str
    read: Callable[[str], dict[str, Any]]


def _parts(text: str, names: tuple[str, ...]) -> list[str]:
    parts = [part.strip() for part in text.split(",")]
    if len(parts) != len(names) or not all(parts):
        raise ValueError(f"expected {', '.join(names)}, with commas between")
    return parts


def _number(text: str, name: str, least: float, greatest: float) -> float:
    try:
        value = float(text)
    except ValueError:
        value = float("nan")
    if not least <= value <= greatest:
        raise ValueError(f"{name} is {text!r}, expected a number from {least:g} to {greatest:g}")
    return value


def _site(text: str) -> dict[str, Any]:
    name, latitude, longitude = _parts(text, ("name", "latitude", "longitude"))
    return {
        "name": name,
        "latitude_deg": _number(latitude, "the latitude", -90, 90),
        "longitude_deg": _number(longitude, "the longitude", -180, 360),
    }


def _place(text: str) -> dict[str, Any]:
    height, zone = _parts(text, ("height in m", "time zone"))
    if zone not in available_timezones():
        raise ValueError(f"{zone!r} is no time zone, expected one such as 'Europe/Madrid'")
    return {"elevation_m": _number(height, "the height", -450, 9000), "timezone": zone}


def _telescope(text: str) -> dict[str, Any]:
    aperture, focal, mount = _parts(text, ("aperture in m", "focal length in m", "mount"))
    if mount not in ("german", "fork", "altazimuth"):
        raise ValueError(f"the mount is {mount!r}, expected german, fork or altazimuth")
    return {
        "aperture_m": _number(aperture, "the aperture", 0.02, 50),
        "focal_length_m": _number(focal, "the focal length", 0.05, 500),
        "mount": mount,
    }


def _camera(text: str) -> dict[str, Any]:
    pixel, columns, rows = _parts(text, ("pixel in µm", "columns", "rows"))
    return {
        "pixel_um": _number(pixel, "the pixel", 0.5, 100),
        "columns": int(_number(columns, "the columns", 1, 100_000)),
        "rows": int(_number(rows, "the rows", 1, 100_000)),
    }


def _filters(text: str) -> dict[str, Any]:
    names = text.replace(",", " ").split()
    unknown = [name for name in names if name not in BANDS]
    if unknown or not names or len(set(names)) < len(names):
        raise ValueError(f"expected each once, of {' '.join(BANDS)}; others can be added later")
    return {"names": names}


def _target(text: str) -> dict[str, Any]:
    name, ra, dec = _parts(text, ("name", "right ascension", "declination"))
    sample = {"filter": "V", "seconds": 60.0, "count": 1}
    said = {"name": name, "ra": ra, "dec": dec}
    try:
        Target.model_validate(said | {"exposures": [sample]})
    except ValueError:
        raise ValueError("expected a name, hours hh:mm:ss and degrees +dd:mm:ss") from None
    return said


QUESTIONS: tuple[Question, ...] = (
    Question("Site: name, latitude, longitude (east positive), degrees",
             "Kestrel Ridge, -31.27, 149.07", _site),
    Question("Its height in metres, time zone", "1165, Australia/Sydney", _place),
    Question("Telescope: aperture in metres, focal length in metres, mount "
             "(german, fork, altazimuth)", "0.8, 5.6, german", _telescope),
    Question("Camera: pixel in micrometres, columns, rows", "9, 2048, 2048", _camera),
    Question(f"Filters, of {' '.join(BANDS)}", "B V R I", _filters),
    Question("A first target: name, right ascension, declination",
             "M 67, 08:51:18, +11:48:00", _target),
)  # fmt: skip


def first_logbook(answers: list[dict[str, Any]]) -> dict[str, str]:
    """Return the texts of a first logbook by file name, from an answer to each question."""
    site, place, telescope, camera, filters, target = answers
    return {
        "observatory.toml": _observatory(site | place, telescope, camera, filters["names"]),
        "targets.toml": _targets(target, filters["names"]),
    }


def write_first_logbook(folder: Path, texts: dict[str, str]) -> None:
    """Write a first logbook into a folder, which may not exist yet; nothing is ever replaced.

    LogbookFaults with all that the answers together leave wrong (a zone far from the longitude);
    then nothing is left behind. WarmroomError when a file is there or can't be written.
    """
    written: list[Path] = []
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, text in texts.items():
            with (folder / name).open("x", encoding="utf-8") as file:
                written.append(folder / name)
                file.write(text)
        load_logbook(folder)
    except FileExistsError as error:
        _take_back(written)
        raise WarmroomError(f"{error.filename} is there already; nothing was written") from None
    except OSError as error:
        _take_back(written)
        raise WarmroomError(f"{folder}: {error.strerror}; nothing was written") from None
    except LogbookFaults:
        _take_back(written)
        raise


def _take_back(written: list[Path]) -> None:
    for path in written:
        path.unlink(missing_ok=True)


def _value(value: object) -> str:
    return tomli_w.dumps({"v": value}).removeprefix("v = ").rstrip("\n")


def _rows(table: str, rows: list[tuple[str, object, str]]) -> str:
    lines = []
    for key, value, comment in rows:
        line = f"{key} = {_value(value)}"
        lines.append(f"{line:<34}# {comment}" if comment else line)
    return f"{table}\n" + "\n".join(lines) + "\n"


def _observatory(
    site: dict[str, Any], telescope: dict[str, Any], camera: dict[str, Any], names: list[str]
) -> str:
    guess = "a guess; put your own here"
    aperture_m = telescope["aperture_m"]
    parts = [
        "# The observatory. `warmroom check --keys` tells every key there may be; 'a guess' marks\n"
        "# what nobody said: it works, and is there to be put right.\n",
        _rows("[site]", [(key, value, "") for key, value in site.items()])
        + "# horizon = [[0, 18], [90, 25], [180, 12], [270, 20]]   # skyline: azimuth, altitude\n",
        _rows(
            "[telescope]",
            [
                ("name", f"{aperture_m * 100:g} cm", ""),
                ("aperture_m", aperture_m, ""),
                ("obstruction", 0.35, f"by diameter; {guess}"),
                ("focal_length_m", telescope["focal_length_m"], ""),
                ("mount", telescope["mount"], ""),
                ("minimum_altitude_deg", 20.0, guess),
                ("slew_deg_per_s", 2.0, guess),
                ("settle_s", 10.0, guess),
                ("optics_fwhm_arcsec", 0.5, f"{guess}; `warmroom past --fit` measures it"),
                ("tracking_fwhm_arcsec", 0.4, guess),
            ],
        ),
        _rows(
            "[camera]",
            [
                *((key, value, "") for key, value in camera.items()),
                ("readout_s", 5.0, guess),
                ("read_noise_e", 8.0, guess),
                ("gain_e_per_adu", 1.0, guess),
                ("saturation_adu", 60000, guess),
            ],
        ),
        *(_band(name, aperture_m) for name in names),
        _rows("[seeing]", [("typical_arcsec", 2.0, f"zenith, 500 nm; {guess}")]),
        _rows(
            "[caution]                         # advice on screen; the observatory's rules decide",
            [
                ("humidity_percent", 85.0, ""),
                ("wind_m_per_s", 12.0, ""),
                ("dew_margin_c", 2.5, ""),
            ],
        ),
    ]
    return "\n".join(parts)


def _band(name: str, aperture_m: float) -> str:
    wavelength, width, extinction, dark = BANDS[name]
    area_m2 = math.pi / 4.0 * aperture_m**2 * (1.0 - 0.35**2)
    electrons = float(vega_photons_per_s_m2_nm(wavelength)) * area_m2 * width * THROUGHPUT
    zero_point = round(2.5 * math.log10(electrons), 1)
    guess = "a guess; measure it"
    return _rows(
        "[[filter]]",
        [
            ("name", name, ""),
            ("wavelength_nm", wavelength, ""),
            ("width_nm", width, ""),
            ("extinction_mag", extinction, f"per airmass; {guess}"),
            ("zero_point_mag", zero_point, f"1 electron a second; {guess}"),
            ("dark_sky_mag", dark, f"per square arcsecond; {guess}"),
            ("change_s", 5.0, ""),
        ],
    )


def _targets(target: dict[str, Any], names: list[str]) -> str:
    exposures = ",\n".join(
        f"    {{ filter = {_value(name)}, seconds = 60, count = 5 }}" for name in names[:2]
    )
    return (
        "# Programmes and targets. A table (CSV, ECSV, VOTable) in targets/ does as well; view 6\n"
        "# of the console adds, changes and imports targets.\n\n"
        "[[programme]]\n"
        'name = "First light"\n'
        'investigator = ""\n\n'
        "[[target]]\n"
        f"name = {_value(target['name'])}\n"
        'programme = "First light"\n'
        f"ra = {_value(target['ra'])}\n"
        f"dec = {_value(target['dec'])}\n"
        "priority = 3                      # 1 to 5, 5 first\n"
        f"exposures = [\n{exposures},\n]\n"
        "# maximum_airmass = 2.0\n"
        "# maximum_image_size_arcsec = 3.0\n"
    )
