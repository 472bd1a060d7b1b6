"""Reading what was typed, at a prompt or on the command line: a value, or what was expected.

A reader takes text and returns a value; its ValueError says what was expected. Nothing here brings
the engine along but its times.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from datetime import UTC, date, datetime

from engine.times import mjd_from_datetime, mjd_from_iso

# The Earth's orbit, of which Sun, twilight and aberration are made, is fitted to these years
# (ERFA epv00).
FIRST_YEAR, LAST_YEAR = 1900, 2099
YEARS = f"from {FIRST_YEAR} to {LAST_YEAR}"


def number_between(least: float, greatest: float, unit: str) -> Callable[[str], float]:
    """Return a reader of a number in a range; a comma may stand for the point."""
    expected = f"expected {least:g} to {greatest:g} {unit}".rstrip()

    def read(text: str) -> float:
        try:
            value = float(text.strip().replace(",", "."))
        except ValueError:
            raise ValueError(expected) from None
        if not math.isfinite(value) or not least <= value <= greatest:
            raise ValueError(expected)
        return value

    return read


def whole_number(text: str) -> int:
    """Return a whole number of 0 or more."""
    try:
        value = int(text)
    except ValueError:
        value = -1
    if value < 0:
        raise ValueError("expected a whole number, 0 or more")
    return value


def night(text: str) -> date:
    """Return the night of a local date such as 2027-03-14."""
    try:
        read = date.fromisoformat(text)
    except ValueError:
        read = date.min
    if not FIRST_YEAR <= read.year <= LAST_YEAR:
        raise ValueError(f"expected a date such as 2027-03-14, {YEARS}")
    return read


def moment(text: str) -> float:
    """Return the MJD of a UTC moment such as 2027-03-14T12:00:00Z."""
    try:
        read = mjd_from_iso(text)
    except (ValueError, OverflowError):
        read = math.nan
    first, after = (
        mjd_from_datetime(datetime(year, 1, 1, tzinfo=UTC)) for year in (FIRST_YEAR, LAST_YEAR + 1)
    )
    if not first <= read < after:
        raise ValueError(f"expected a moment such as 2027-03-14T12:00:00Z, {YEARS}")
    return read
