"""Reading a time of the night that was typed; see `tui.reading` for the rest."""

from __future__ import annotations

import re
from collections.abc import Callable
from datetime import datetime, timedelta
from zoneinfo import ZoneInfo

from engine.logbook import Logbook
from engine.positions import Almanac
from engine.times import mjd_from_datetime

_CLOCK = re.compile(r"([0-9]{1,2})[:. ]?([0-9]{2})\Z")


def moment_in(times: Almanac, logbook: Logbook) -> Callable[[str], float]:
    """Return a reader of a local time of a night, as its UTC MJD: 23:40, or 2340."""
    zone = ZoneInfo(logbook.observatory.site.timezone)

    def read(text: str) -> float:
        found = _CLOCK.match(text.strip())
        hour, minute = (int(part) for part in found.groups()) if found else (99, 99)
        if hour > 23 or minute > 59:
            raise ValueError("expected a local time such as 23:40")
        # Before noon it is the morning of the next date.
        day = times.night + timedelta(days=1 if hour < 12 else 0)
        return mjd_from_datetime(datetime(day.year, day.month, day.day, hour, minute, tzinfo=zone))

    return read
