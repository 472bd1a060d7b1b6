"""How a report says things: local times, lengths of time, numbers that may not be known."""

from __future__ import annotations

from datetime import UTC, tzinfo
from zoneinfo import ZoneInfo

from engine.report.night import NightReport
from engine.times import clock_time

# Field of the almanac and what it is called, in the order of an ordinary night.
EVENTS = (
    ("sunset", "sunset"),
    ("nautical_dusk", "dusk, Sun at -12°"),
    ("astronomical_dusk", "dusk, Sun at -18°"),
    ("astronomical_dawn", "dawn, Sun at -18°"),
    ("nautical_dawn", "dawn, Sun at -12°"),
    ("sunrise", "sunrise"),
    ("moonrise", "moonrise"),
    ("moonset", "moonset"),
)


def zone_of(report: NightReport) -> tzinfo:
    """Return the site's zone, UTC where the log does not say."""
    return ZoneInfo(report.site.timezone) if report.site else UTC


def clock(report: NightReport, mjd: float) -> str:
    """Return a moment (UTC MJD) as local time to the nearest minute, ``21:04``."""
    return clock_time(mjd, zone_of(report))


def hours(seconds: float) -> str:
    """Return a length of time (s) as hours and minutes, ``3 h 07 min``."""
    minutes = round(seconds / 60.0)
    return f"{minutes // 60} h {minutes % 60:02d} min" if minutes >= 60 else f"{minutes} min"


def number(value: float | None, form: str = ".2f") -> str:
    """Return a number, a dash where it is not known."""
    return "-" if value is None else format(value, form)


def span(least: float | None, greatest: float | None) -> str:
    """Return a range of numbers as it is read, ``1.04 to 1.31``."""
    if least is None or greatest is None:
        return "-"
    low, high = f"{least:.2f}", f"{greatest:.2f}"
    return low if low == high else f"{low} to {high}"


def share(part: float, whole: float) -> str:
    """Return a part as percent of a whole; a dash of nothing."""
    return f"{part / whole:.0%}" if whole > 0.0 else "-"
