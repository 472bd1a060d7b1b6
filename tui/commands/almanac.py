"""``warmroom almanac``: the night's Sun, twilight and Moon times."""

from __future__ import annotations

import argparse
from datetime import UTC
from zoneinfo import ZoneInfo

from engine.clock import SystemClock
from engine.logbook import load_logbook
from engine.positions import almanac, earth_table_note
from engine.positions.second_opinion import astroplans_almanac
from engine.times import SECONDS_PER_DAY, night_of
from tui.commands.output import clock_time, iso_or_none, print_columns, print_json

# Field of the almanac, and what a person calls it, in the order of an ordinary night.
EVENTS = (
    ("sunset", "Sun sets"),
    ("civil_dusk", "civil dusk, Sun at -6°"),
    ("nautical_dusk", "nautical dusk, Sun at -12°"),
    ("astronomical_dusk", "astronomical dusk, Sun at -18°"),
    ("astronomical_dawn", "astronomical dawn, Sun at -18°"),
    ("nautical_dawn", "nautical dawn, Sun at -12°"),
    ("civil_dawn", "civil dawn, Sun at -6°"),
    ("sunrise", "Sun rises"),
    ("moonrise", "Moon rises"),
    ("moonset", "Moon sets"),
)


def run(arguments: argparse.Namespace) -> int:
    """Print the almanac of one night."""
    site = load_logbook(arguments.logbook).observatory.site
    night = arguments.night or night_of(SystemClock().now_mjd(), site.timezone)
    times = almanac(site, night)
    if arguments.json:
        print_json(
            {"night": night.isoformat()}
            | {name: iso_or_none(getattr(times, name)) for name, _ in EVENTS}
            | {"moon_illumination": times.moon_illumination}
        )
        return 0
    zone = ZoneInfo(site.timezone)
    print(f"{site.name}, night of {night.isoformat()}: the Sun {times.sun_state}")
    theirs = astroplans_almanac(site, times) if arguments.doubt else None
    rows = []
    for name, label in EVENTS:
        mjd = getattr(times, name)
        if mjd is not None:
            rows.append((mjd, label if theirs is None else f"{label}{_apart(mjd, theirs[name])}"))
    print_columns(
        ("local", "UTC", ""),
        [(clock_time(m, zone), clock_time(m, UTC), label) for m, label in sorted(rows)],
        left=2,
    )
    missing = [label for name, label in EVENTS if getattr(times, name) is None]
    if missing:
        print(f"not this night: {'; '.join(missing)}")
    print(f"Moon at the middle of the night: {times.moon_illumination:.0%} lit")
    note = earth_table_note(times.begin_mjd)
    if note:
        print(note)
    return 0


def _apart(mjd: float, theirs_mjd: float | None) -> str:
    """Return how far astroplan's time of an event lies from ours."""
    if theirs_mjd is None:
        return "; astroplan finds none"
    return f"; astroplan {(theirs_mjd - mjd) * SECONDS_PER_DAY:+.1f} s"
