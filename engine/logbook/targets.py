"""What ``targets.toml`` and the target tables say: programmes and their targets."""

from __future__ import annotations

import re
from datetime import datetime
from typing import Annotated, Literal

from pydantic import BeforeValidator, Field, field_validator

from engine.logbook.observatory import FileModel, Name, key
from engine.times import mjd_from_datetime

_SEXAGESIMAL = re.compile(r"([+-]?)(\d{1,3})[: ](\d{1,2})(?:[: ](\d{1,2}(?:\.\d*)?))?\Z")


def parse_angle(text: str) -> float:
    """Return the value of ``[+-]a:b[:c]`` in units of its first part; ValueError if it is none."""
    match = _SEXAGESIMAL.match(text.strip())
    if match is None:
        raise ValueError(text)
    sign, whole, minutes, seconds = match.groups()
    if int(minutes) >= 60 or float(seconds or 0) >= 60:
        raise ValueError(text)
    value = int(whole) + int(minutes) / 60.0 + float(seconds or 0) / 3600.0
    return -value if sign == "-" else value


def _right_ascension_deg(value: object) -> object:
    if not isinstance(value, str):
        return value
    try:
        hours = parse_angle(value)
    except ValueError:
        hours = -1.0
    if not (0 <= hours < 24) or value.strip().startswith("-"):
        raise ValueError(f"{value!r}, expected hours 'hh:mm:ss.s' from 0 to 24, or degrees")
    return hours * 15.0


def _declination_deg(value: object) -> object:
    if not isinstance(value, str):
        return value
    try:
        degrees = parse_angle(value)
    except ValueError:
        degrees = 999.0
    if not (-90 <= degrees <= 90):
        raise ValueError(f"{value!r}, expected '+dd:mm:ss' from -90 to +90, or degrees")
    return degrees


class Programme(FileModel):
    """A programme of observations and who answers for it."""

    name: Name = key("the programme's name")
    investigator: Name = key("who it is for", default="")


class PlannedExposures(FileModel):
    """So many exposures of so many seconds in one filter."""

    filter: Name = key("a filter in the wheel")
    seconds: float = key("length of one exposure", unit="s", gt=0, le=86400)
    count: int = key("how many", ge=1, le=100_000)


class Target(FileModel):
    """One target: where it is, what is wanted of it, and its own limits."""

    name: Name = key("the target's name; each name once", min_length=1)
    programme: Name = key("the programme it belongs to", default="")
    ra_deg: Annotated[float, BeforeValidator(_right_ascension_deg)] = key(
        "right ascension, ICRS: hours 'hh:mm:ss.s', or degrees as a number",
        unit="deg",
        ge=0,
        lt=360,
        alias="ra",
    )
    dec_deg: Annotated[float, BeforeValidator(_declination_deg)] = key(
        "declination, ICRS: '+dd:mm:ss', or degrees as a number",
        unit="deg",
        ge=-90,
        le=90,
        alias="dec",
    )
    pm_ra_mas_per_yr: float = key(
        "proper motion in right ascension, with cos(dec)", unit="mas/yr", default=0.0
    )
    pm_dec_mas_per_yr: float = key("proper motion in declination", unit="mas/yr", default=0.0)
    epoch_yr: float = key(
        "epoch of the coordinates (Julian year)", unit="yr", ge=1800, le=2200, default=2000.0
    )
    magnitude: float | None = key("magnitude, for exposure advice", unit="mag", default=None)
    priority: int = key("1 to 5, 5 first", ge=1, le=5, default=3)
    exposures: Annotated[tuple[PlannedExposures, ...], Field(strict=False, min_length=1)] = key(
        "the plan: a list of { filter, seconds, count }"
    )
    maximum_airmass: float | None = key("not beyond this airmass", ge=1, le=40, default=None)
    maximum_image_size_arcsec: float | None = key(
        "not when images would be larger", unit="arcsec", gt=0, le=60, default=None
    )
    minimum_moon_separation_deg: float | None = key(
        "not closer to the Moon while it is up", unit="deg", ge=0, le=180, default=None
    )
    windows: Annotated[tuple[tuple[datetime, datetime], ...], Field(strict=False)] = key(
        "only inside these [begin, end] pairs, UTC", default=()
    )
    contiguous_min: float | None = key(
        "wants this long without leaving", unit="min", gt=0, le=1440, default=None
    )
    role: Literal["science", "standard"] = key("what it is for", default="science")

    @field_validator("windows", mode="before")
    @classmethod
    def _pairs(cls, value: object) -> object:
        if isinstance(value, list):
            return tuple(tuple(pair) if isinstance(pair, list) else pair for pair in value)
        return value

    @field_validator("windows")
    @classmethod
    def _forward_windows(
        cls, value: tuple[tuple[datetime, datetime], ...]
    ) -> tuple[tuple[datetime, datetime], ...]:
        for begin, end in value:
            if begin.tzinfo is None or end.tzinfo is None:
                raise ValueError("a time without a zone, expected UTC such as 2027-03-14T11:00:00Z")
            if end <= begin:
                raise ValueError("a window ends before it begins, expected [begin, end]")
        return value

    @property
    def windows_mjd(self) -> tuple[tuple[float, float], ...]:
        """The windows as UTC MJDs (days)."""
        return tuple((mjd_from_datetime(b), mjd_from_datetime(e)) for b, e in self.windows)
