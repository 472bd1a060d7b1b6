"""Moments as the observer reads them: local time of the site, and dates."""

from __future__ import annotations

from datetime import date
from zoneinfo import ZoneInfo

from engine.order.problem import Problem
from engine.times import clock_time, datetime_from_mjd

MONTHS = (
    *("January", "February", "March", "April", "May", "June"),
    *("July", "August", "September", "October", "November", "December"),
)


def local_time(problem: Problem, mjd: float) -> str:
    """Return a moment (UTC MJD) as local time, ``02:10``."""
    return clock_time(mjd, ZoneInfo(problem.night.observatory.site.timezone))


def local_date(problem: Problem, mjd: float) -> str:
    """Return the local date of a moment (UTC MJD), ``2 April``."""
    zone = ZoneInfo(problem.night.observatory.site.timezone)
    return day_month(datetime_from_mjd(mjd).astimezone(zone).date())


def day_month(day: date) -> str:
    """Return a date without its year, ``2 April``."""
    return f"{day.day} {MONTHS[day.month - 1]}"
