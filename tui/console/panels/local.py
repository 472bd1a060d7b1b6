"""Moments and numbers as the observer reads them."""

from __future__ import annotations

import math
from datetime import datetime
from zoneinfo import ZoneInfo

from engine.order import Visit
from engine.times import datetime_from_mjd
from engine.watch import Watch


def local(watch: Watch, mjd: float) -> datetime:
    """Return a moment (UTC MJD) in the site's own time."""
    zone = ZoneInfo(watch.planner.logbook.observatory.site.timezone)
    return datetime_from_mjd(mjd).astimezone(zone)


def ahead(watch: Watch) -> tuple[Visit, ...]:
    """Return the visits of the order that are not over, in turn."""
    return watch.plan.ahead(watch.clock.now_mjd()) if watch.plan else ()


def hhmm(watch: Watch, mjd: float) -> str:
    """Return a moment as local hours and minutes, to the nearest minute."""
    return f"{local(watch, mjd + 0.5 / 1440.0):%H:%M}"


def arcsec(value: float) -> str:
    """Return an angle on the sky as ``1.62"``, or a dash for none."""
    return f'{value:.2f}"' if math.isfinite(value) else "-"


def ago(minutes: float) -> str:
    """Return how long ago something was, in words."""
    if minutes < 1.5:
        return "just now"
    return f"{minutes:.0f} min ago" if minutes < 90 else f"{minutes / 60:.1f} h ago"
