"""What ``targets.toml`` and the target tables say: programmes and their targets."""

from __future__ import annotations

import re
from datetime import datetime
from typing import Annotated, Literal, Self

from pydantic import BeforeValidator, Field, field_validator, model_validator

from engine.logbook.faults import KeyPath, Misfits
from engine.logbook.observatory import LONGEST_LIST, FileModel, Name, key
from engine.logbook.text import shown
from engine.times import mjd_from_datetime

_SEXAGESIMAL = re.compile(
    r"([+-]?)([0-9]{1,3})[: ]([0-9]{1,2})(?:[: ]([0-9]{1,2}(?:\.[0-9]*)?))?\Z"
)
# Exposures as a table or a person writes them: ``V:60x5`` is five of a minute in V.
EXPOSURES_WORD = re.compile(r"(\S+):([0-9]{1,9}(?:\.[0-9]*)?)x([0-9]{1,9})\Z")
RIGHT_ASCENSION = "hours 'hh:mm:ss.s', or degrees from 0 to less than 360"
DECLINATION = "'+dd:mm:ss', or degrees from -90 to 90"
MOMENTS = ("2027-03-14T11:00:00Z", "2027-03-14T12:20:00Z")
WINDOW = f"[{', '.join(MOMENTS)}], or {'/'.join(MOMENTS)} in a table"


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
        raise ValueError(f"{shown(value)}, expected {RIGHT_ASCENSION}")
    return hours * 15.0


def _declination_deg(value: object) -> object:
    if not isinstance(value, str):
        return value
    try:
        degrees = parse_angle(value)
    except ValueError:
        degrees = 999.0
    if not (-90 <= degrees <= 90):
        raise ValueError(f"{shown(value)}, expected {DECLINATION}")
    return degrees


class Programme(FileModel):
    """A programme of observations and who answers for it."""

    name: Name = key("the programme's name", min_length=1)
    investigator: Name = key("who it is for", default="")


class PlannedExposures(FileModel):
    """So many exposures of so many seconds in one filter."""

    filter: Name = key("a filter in the wheel", min_length=1)
    seconds: float = key("length of one exposure", unit="s", gt=0, le=86400)
    count: int = key("how many", ge=1, le=100_000)


class Target(FileModel):
    """One target: where it is, what is wanted of it, and its own limits."""

    name: Name = key("the target's name; each name once", min_length=1)
    programme: Name = key("the programme it belongs to", default="")
    ra_deg: Annotated[float, BeforeValidator(_right_ascension_deg)] = key(
        "right ascension, ICRS",
        unit="deg",
        form=RIGHT_ASCENSION,
        ge=0,
        lt=360,
        alias="ra",
    )
    dec_deg: Annotated[float, BeforeValidator(_declination_deg)] = key(
        "declination, ICRS",
        unit="deg",
        form=DECLINATION,
        ge=-90,
        le=90,
        alias="dec",
    )
    pm_ra_mas_per_yr: float = key(
        "proper motion in right ascension, with cos(dec)",
        unit="mas/yr",
        ge=-20_000,
        le=20_000,
        default=0.0,
    )
    pm_dec_mas_per_yr: float = key(
        "proper motion in declination", unit="mas/yr", ge=-20_000, le=20_000, default=0.0
    )
    epoch_yr: float = key(
        "epoch of the coordinates (Julian year)", unit="yr", ge=1800, le=2200, default=2000.0
    )
    magnitude: float | None = key(
        "magnitude, for exposure advice", unit="mag", ge=-30, le=40, default=None
    )
    priority: int = key("1 to 5, 5 first", ge=1, le=5, default=3)
    exposures: Annotated[
        tuple[PlannedExposures, ...],
        Field(strict=False, min_length=1, max_length=LONGEST_LIST),
    ] = key(
        "the plan, in the order in which it is taken",
        form='a list of { filter = "V", seconds = 60, count = 5 }, or V:60x5 in a table',
    )
    maximum_airmass: float | None = key("not beyond this airmass", ge=1, le=40, default=None)
    maximum_image_size_arcsec: float | None = key(
        "not when images would be larger", unit="arcsec", gt=0, le=60, default=None
    )
    minimum_moon_separation_deg: float | None = key(
        "not closer to the Moon while it is up", unit="deg", ge=0, le=180, default=None
    )
    windows: tuple[tuple[datetime, datetime], ...] = key(
        "only inside these", form=f"a list of {WINDOW}", default=()
    )
    contiguous_min: float | None = key(
        "wants this long without leaving", unit="min", gt=0, le=1440, default=None
    )
    visits: int = key(
        "how often all of its exposures are wanted in one night", ge=1, le=200, default=1
    )
    least_gap_min: float | None = key(
        "from the begin of one visit to the next, at least", unit="min", gt=0, le=1440, default=None
    )
    greatest_gap_min: float | None = key(
        "from the begin of one visit to the next, at most", unit="min", gt=0, le=1440, default=None
    )
    each_night: bool = key(
        "wanted anew every night: what earlier nights have done does not count", default=False
    )
    role: Literal["science", "standard"] = key("what it is for", default="science")

    @model_validator(mode="after")
    def _gaps_of_visits(self) -> Self:
        least, greatest = self.least_gap_min, self.greatest_gap_min
        if self.visits > 1 and least is None:
            raise Misfits(
                [(("least_gap_min",), "is missing, expected for more than one of visits")]
            )
        if self.visits == 1 and (least or greatest):
            name = "least_gap_min" if least else "greatest_gap_min"
            raise Misfits([((name,), "is between visits, expected more than one of visits")])
        if least and greatest and least > greatest:
            what = f"{greatest:g}, expected at least least_gap_min, {least:g}"
            raise Misfits([(("greatest_gap_min",), what)])
        return self

    @field_validator("windows", mode="before")
    @classmethod
    def _forward_windows(cls, value: object) -> tuple[tuple[datetime, datetime], ...]:
        if not isinstance(value, list | tuple) or len(value) > LONGEST_LIST:
            raise ValueError(
                f"{shown(value)}, expected a list, at most {LONGEST_LIST}, of {WINDOW}"
            )
        wrong: list[tuple[KeyPath, str]] = []
        windows: list[tuple[datetime, datetime]] = []
        for place, pair in enumerate(value):
            match pair:
                case (datetime() as begin, datetime() as end):
                    naive = next((each for each in pair if each.tzinfo is None), None)
                    if naive is not None:
                        what = f"{shown(naive)} has no time zone, expected UTC with a Z at its end"
                    elif end <= begin:
                        what = f"ends at {shown(end)}, expected later than its begin"
                    else:
                        windows.append((begin, end))
                        continue
                case _:
                    what = f"{shown(pair)}, expected {WINDOW}"
            wrong.append(((place,), what))
        if wrong:
            raise Misfits(wrong)
        return tuple(windows)

    @property
    def windows_mjd(self) -> tuple[tuple[float, float], ...]:
        """The windows as UTC MJDs (days)."""
        return tuple((mjd_from_datetime(b), mjd_from_datetime(e)) for b, e in self.windows)
