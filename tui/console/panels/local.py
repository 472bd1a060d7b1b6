"""Moments and numbers as the observer reads them."""

from __future__ import annotations

import math
from datetime import datetime
from zoneinfo import ZoneInfo

from engine.order import Visit
from engine.times import MINUTES_PER_DAY, clock_time, datetime_from_mjd
from engine.watch import Watch


def local(watch: Watch, mjd: float) -> datetime:
    """Return a moment (UTC MJD) in the site's own time."""
    return datetime_from_mjd(mjd).astimezone(_zone(watch))


def _zone(watch: Watch) -> ZoneInfo:
    return ZoneInfo(watch.planner.logbook.observatory.site.timezone)


def ahead(watch: Watch) -> tuple[Visit, ...]:
    """Return the visits of the order that are not over, in turn."""
    return watch.plan.ahead(watch.clock.now_mjd()) if watch.plan else ()


def hhmm(watch: Watch, mjd: float) -> str:
    """Return a moment as local hours and minutes, to the nearest minute."""
    return clock_time(mjd, _zone(watch))


def whole_hours(watch: Watch, room: int, least_min: float = 60.0) -> list[float]:
    """Return round local times of the night from now on (UTC MJD), at most so many.

    They are ``least_min`` minutes apart, or as many hours as it takes to have room.
    """
    night, now_mjd = watch.planner.night, watch.clock.now_mjd()
    moment = local(watch, now_mjd)
    gone_min = moment.minute + moment.second / 60.0
    for step_min in (least_min, *(60.0 * hours for hours in range(1, 25))):
        first_mjd = now_mjd + (step_min - gone_min % min(step_min, 60.0)) / MINUTES_PER_DAY
        if step_min > 60.0:
            first_mjd = now_mjd + (60.0 - gone_min) / MINUTES_PER_DAY
        count = max(int((night.mjd[-1] - first_mjd) * MINUTES_PER_DAY / step_min) + 1, 0)
        if count <= max(room, 1):
            return [first_mjd + place * step_min / MINUTES_PER_DAY for place in range(count)]
    return []


def arcsec(value: float) -> str:
    """Return an angle on the sky as ``1.62"``, or a dash for none."""
    return f'{value:.2f}"' if math.isfinite(value) else "-"


def ago(minutes: float) -> str:
    """Return how long ago something was, in words."""
    if minutes < 1.5:
        return "just now"
    return f"{minutes:.0f} min ago" if minutes < 90 else f"{minutes / 60:.1f} h ago"
