"""The head: where, when, and whether anything is wrong. Two lines."""

from __future__ import annotations

from engine.positions import sidereal_time_h
from engine.times import datetime_from_mjd
from engine.watch import Watch
from tui.console.panels.local import ago, local
from tui.paint.spans import Line, Span, line, phrases, spread, width_of

SUN_LIGHT = ((-50.0 / 60.0, "day"), (-6.0, "civil"), (-12.0, "nautical"), (-18.0, "astronomical"))


def paint_head(watch: Watch, width: int) -> list[Line]:
    """Return the head's two lines."""
    now_mjd = watch.clock.now_mjd()
    site = watch.planner.logbook.observatory.site
    moment = local(watch, now_mjd)
    lst_h = float(sidereal_time_h(now_mjd, site.longitude_deg))
    pace = f" ×{watch.clock.pace:g}" if watch.clock.pace != 1.0 else ""
    clock = line(
        Span(f"{moment:%H:%M:%S}", "strong"),
        Span(f" local{pace}  ", "dim"),
        Span(f"{datetime_from_mjd(now_mjd):%H:%M}", "text"),
        Span(" UTC  ", "dim"),
        Span(f"{int(lst_h):02d}:{int(lst_h % 1 * 60):02d}", "text"),
        Span(" LST", "dim"),
    )
    place = line(
        Span(site.name, "title"),
        Span(f"  night of {watch.planner.night.almanac.night.isoformat()}", "dim"),
    )
    disk = _disk(watch)
    sky = _sky(watch, now_mjd, width - width_of(disk) - 1)
    return [spread(place, clock, width), spread(sky, disk, width)]


def _sky(watch: Watch, now_mjd: float, width: int) -> Line:
    night = watch.planner.night
    at = night.index_at(now_mjd)
    moon_deg = float(night.moon.altitude_deg[at])
    lit = f"{night.moon.illumination[at]:.0%}"
    moon = f"Moon {moon_deg:+.0f}° {lit}" if moon_deg > 0 else f"Moon down {lit}"
    return phrases(
        width,
        _seeing(watch),
        line(Span(f"   {moon}", "moon")),
        line(Span("   "), _sun(watch, at)),
    )


def _seeing(watch: Watch) -> Line:
    if watch.plan is None:
        return line(Span("seeing ", "dim"), "...")
    now_mjd = watch.clock.now_mjd()
    forecast = watch.plan.forecast
    median, low, high = (float(value) for value in forecast.at(now_mjd))
    age_min = forecast.age_min + (now_mjd - forecast.now_mjd) * 1440.0
    source = ago(age_min) if forecast.measured else "usual here"
    return line(
        Span("seeing ", "dim"),
        Span(f'{median:.2f}"', "strong"),
        Span(f" {low:.1f}-{high:.1f} {source}", "dim"),
    )


def _sun(watch: Watch, at: int) -> Span:
    altitude = float(watch.planner.night.sun.altitude_deg[at])
    light = next((name for limit, name in SUN_LIGHT if altitude > limit), None)
    if light is None:
        return Span("dark", "dim")
    return Span("day" if light == "day" else f"{light} twilight", "sky")


def _disk(watch: Watch) -> Line:
    if watch.is_read_only:
        said = "looking on" if watch.trouble is None else "NOTHING NEW CAN BE READ"
        return line(Span(said, "moon" if watch.trouble is None else "bad"))
    if watch.trouble:
        return line(Span(f"LOG NOT WRITTEN: {watch.unwritten} waiting", "bad"))
    if watch.unwritten:
        return line(Span(f"log: {watch.unwritten} being written", "warn"))
    return line(Span("log on disk", "good"))
