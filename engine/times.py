"""Time at the edges: MJD floats inside, aware datetimes and ISO strings outside.

Every time inside the engine is UTC as a Modified Julian Date (days, float64). A double holds an
MJD of this century to about a microsecond, far finer than anything done here needs.

During a leap second UTC has no MJD of its own; it is read as the first second of the next day.
"""

from __future__ import annotations

from datetime import UTC, date, datetime, time, timedelta, tzinfo
from zoneinfo import ZoneInfo

MJD_EPOCH = datetime(1858, 11, 17, tzinfo=UTC)
MINUTES_PER_DAY = 1440.0
SECONDS_PER_DAY = 86400.0
HOURS_PER_DAY = 24.0


def mjd_from_datetime(moment: datetime) -> float:
    """Return the UTC MJD (days) of an aware datetime; ValueError for a naive one."""
    if moment.tzinfo is None:
        raise ValueError(f"{moment!r} has no time zone")
    since = moment - MJD_EPOCH
    return since.days + (since.seconds + since.microseconds * 1e-6) / SECONDS_PER_DAY


def datetime_from_mjd(mjd: float) -> datetime:
    """Return the aware UTC datetime of an MJD (days), to the nearest millisecond."""
    days, fraction = divmod(mjd, 1.0)
    milliseconds = round(fraction * SECONDS_PER_DAY * 1000.0)
    return MJD_EPOCH + timedelta(days=int(days), milliseconds=milliseconds)


def iso_from_mjd(mjd: float) -> str:
    """Return ``2027-03-14T12:04:33.125Z``, to the millisecond."""
    return iso_from_datetime(datetime_from_mjd(mjd))


def iso_from_datetime(moment: datetime) -> str:
    """Return an aware datetime as UTC ``2027-03-14T12:04:33.125Z``, to the millisecond."""
    utc = moment.astimezone(UTC)
    return utc.strftime("%Y-%m-%dT%H:%M:%S.") + f"{utc.microsecond // 1000:03d}Z"


def clock_time(mjd: float, zone: tzinfo) -> str:
    """Return an MJD as a clock of a zone shows it, ``21:04``, to the nearest minute."""
    return datetime_from_mjd(mjd + 0.5 / MINUTES_PER_DAY).astimezone(zone).strftime("%H:%M")


def mjd_from_iso(text: str) -> float:
    """Return the MJD of an ISO 8601 moment; one without a zone is taken as UTC.

    Raises ValueError for anything else.
    """
    moment = datetime.fromisoformat(text)
    return mjd_from_datetime(moment if moment.tzinfo else moment.replace(tzinfo=UTC))


def night_of(mjd: float, timezone: str) -> date:
    """Return the night a moment belongs to: the local date at its evening, noon to noon."""
    local = datetime_from_mjd(mjd).astimezone(ZoneInfo(timezone))
    return (local.replace(tzinfo=None) - timedelta(hours=12)).date()


def night_span_mjd(night: date, timezone: str) -> tuple[float, float]:
    """Return the MJDs of the local noons that begin and end a night.

    Usually 24 h apart; 23 or 25 h when the clocks change in between.
    """
    zone = ZoneInfo(timezone)
    noons = (datetime.combine(day, time(12), zone) for day in (night, night + timedelta(days=1)))
    begin, end = (mjd_from_datetime(noon) for noon in noons)
    return begin, end
