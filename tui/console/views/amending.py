"""How an entry of the log is put right: a letter and a word for each key, and a reader for each."""

from __future__ import annotations

from collections.abc import Callable

from engine.log import LOST_CAUSES, OUTCOMES, Event
from engine.log.keys import KEYS
from engine.log.values import Value
from engine.logbook.text import nearest, one_line, shown
from engine.watch import Watch
from engine.watch.corrections import amendable
from tui.console.asking import text_of
from tui.reading import number_between

Reader = Callable[[str], Value]

# What a key is called when it is asked for, and its letter.
WORDS: dict[str, tuple[str, str]] = {
    "outcome": ("o", "outcome"),
    "measured_fwhm_arcsec": ("m", "measured FWHM"),
    "filter": ("f", "filter"),
    "target": ("t", "target"),
    "frame": ("n", "frame name"),
    "why": ("w", "why"),
    "text": ("x", "text"),
    "seeing_arcsec": ("z", "seeing"),
    "cloud_percent": ("c", "cloud"),
    "wind_m_per_s": ("w", "wind"),
    "humidity_percent": ("h", "humidity"),
    "temperature_c": ("t", "temperature"),
    "dew_point_c": ("d", "dew point"),
    "pressure_hpa": ("p", "pressure"),
    "sky_mag_arcsec2": ("s", "sky"),
    "cause": ("c", "cause"),
    "position": ("p", "position"),
    "fwhm_arcsec": ("m", "FWHM"),
    "what": ("w", "what"),
    "seconds": ("s", "seconds"),
    "count": ("c", "count"),
    "level_adu": ("l", "level"),
}
# What can be true of a number: least, greatest, unit.
RANGES: dict[str, tuple[float, float, str]] = {
    "measured_fwhm_arcsec": (0.1, 30.0, "arcsec"),
    "fwhm_arcsec": (0.1, 30.0, "arcsec"),
    "seeing_arcsec": (0.1, 20.0, "arcsec"),
    "cloud_percent": (0.0, 100.0, "%"),
    "wind_m_per_s": (0.0, 100.0, "m/s"),
    "humidity_percent": (0.0, 100.0, "%"),
    "temperature_c": (-60.0, 50.0, "°C"),
    "dew_point_c": (-80.0, 40.0, "°C"),
    "pressure_hpa": (400.0, 1100.0, "hPa"),
    "sky_mag_arcsec2": (5.0, 25.0, "mag per square arcsecond"),
    "position": (-1e9, 1e9, "the focuser's own"),
    "seconds": (0.0, 86400.0, "s"),
    "level_adu": (0.0, 1e6, "ADU"),
}
LONGEST = 2000


def choices_for(event: Event) -> tuple[tuple[str, str], ...]:
    """Return the letter and word of each key of an entry that can be put right."""
    return tuple(WORDS[key] for key in amendable(event))


def key_of(event: Event, letter: str) -> str:
    """Return the key behind a letter."""
    return next(key for key in amendable(event) if WORDS[key][0] == letter)


def typed_as(value: object) -> str:
    """Return a value as it would be typed."""
    return f"{value:g}" if isinstance(value, float) else "" if value is None else str(value)


def reader_for(watch: Watch, event: Event, key: str) -> Reader:
    """Return the reader of a key's value; its ValueError says what was expected."""
    if key in RANGES:
        return number_between(*RANGES[key])
    if key == "count":
        return _whole
    match key:
        case "outcome":
            return _one_of(tuple(each.value for each in OUTCOMES))
        case "cause":
            return _one_of(tuple(each.value for each in LOST_CAUSES))
        case "filter":
            return _one_of(tuple(e.name for e in watch.planner.logbook.observatory.filters))
        case "target" if event.kind != "note":
            return _one_of(tuple(each.name for each in watch.planner.night.targets))
    return text_of(LONGEST, least=1 if KEYS[event.kind][key].is_required else 0)


def _one_of(known: tuple[str, ...]) -> Reader:
    def read(text: str) -> str:
        text = one_line(text)
        if text in known:
            return text
        near = nearest(text, known) or f", expected one of {', '.join(known[:8])}"
        raise ValueError(f"{shown(text)} is none{near}")

    return read


def _whole(text: str) -> int:
    if not text.strip().isdecimal() or not 1 <= int(text) <= 100_000:
        raise ValueError("expected a whole number from 1")
    return int(text)
