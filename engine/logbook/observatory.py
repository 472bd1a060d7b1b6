"""What ``observatory.toml`` says: the site, the telescope, the camera, the filters, the limits.

Each field carries its unit, its range and a line of help; the reference page is made from them.
Names are fixed by the file's contract: add keys freely, rename none.
"""

from __future__ import annotations

import math
from datetime import datetime
from typing import Annotated, Any, Literal, Self, TypeGuard
from zoneinfo import ZoneInfo, available_timezones

from pydantic import AfterValidator, BaseModel, ConfigDict, Field, field_validator, model_validator

from engine.logbook.faults import KeyPath, Misfits
from engine.logbook.text import clean_name, nearest, shown

ARCSEC_PER_RADIAN = 206264.806247

Name = Annotated[str, AfterValidator(clean_name)]


MOST_FILTERS = 100
LONGEST_LIST = 1000


def key(help_text: str, *, unit: str = "", form: str = "", **limits: Any) -> Any:
    """Declare a key of a file: its help, its unit, and pydantic's own limits.

    ``form`` says in words what is expected where type, unit and limits do not.
    """
    return Field(description=help_text, json_schema_extra={"unit": unit, "form": form}, **limits)


def is_number(value: object, low: float, high: float) -> TypeGuard[float]:
    """Say whether a value from a file is a number between limits; NaN and true are not."""
    return isinstance(value, int | float) and not isinstance(value, bool) and low <= value <= high


class FileModel(BaseModel):
    """A table in a logbook file: nothing is converted silently, nothing unknown is accepted."""

    model_config = ConfigDict(
        strict=True, frozen=True, extra="forbid", populate_by_name=True, allow_inf_nan=False
    )


class Site(FileModel):
    """Where the telescope stands."""

    name: Name = key("the site's name, as it goes into the log", min_length=1)
    latitude_deg: float = key("geodetic latitude, north positive", unit="deg", ge=-90, le=90)
    longitude_deg: float = key("longitude, east positive", unit="deg", ge=-180, le=360)
    elevation_m: float = key("height above the sea", unit="m", ge=-450, le=9000)
    timezone: str = key(
        "a night is named by the local date of its evening",
        form="an IANA time zone such as 'Europe/Madrid'",
    )
    horizon: tuple[tuple[float, float], ...] = key(
        "the skyline as [azimuth_deg, altitude_deg] pairs; closes on itself",
        unit="deg",
        form="pairs [azimuth_deg, altitude_deg] by rising azimuth",
        default=(),
    )

    airmass_model: Literal["pickering", "kasten_young", "young", "hardie", "secant"] = key(
        "the formula for airmass; Pickering 2002 where nothing is said", default="pickering"
    )

    @field_validator("timezone")
    @classmethod
    def _known_timezone(cls, value: str) -> str:
        try:
            ZoneInfo(value)
        except (KeyError, ValueError, OSError):
            close = nearest(value, sorted(available_timezones()))
            what = f"{shown(value)}, expected an IANA time zone such as 'Europe/Madrid'{close}"
            raise ValueError(what) from None
        return value

    @field_validator("horizon", mode="before")
    @classmethod
    def _rising_horizon(cls, value: object) -> tuple[tuple[float, float], ...]:
        if not isinstance(value, list | tuple) or len(value) > LONGEST_LIST:
            wanted = f"at most {LONGEST_LIST} pairs [azimuth_deg, altitude_deg]"
            raise ValueError(f"{shown(value)}, expected {wanted}")
        wrong: list[tuple[KeyPath, str]] = []
        skyline: list[tuple[float, float]] = []
        for place, pair in enumerate(value):
            match pair:
                case (azimuth, altitude) if is_number(azimuth, 0, 360) and azimuth < 360:
                    if not is_number(altitude, 0, 90):
                        what = f"altitude {shown(altitude)}, expected degrees from 0 to 90"
                    elif skyline and azimuth <= skyline[-1][0]:
                        before = skyline[-1][0]
                        what = f"azimuth {azimuth:g} after {before:g}, expected azimuths that rise"
                    else:
                        skyline.append((float(azimuth), float(altitude)))
                        continue
                case (azimuth, _):
                    what = f"azimuth {shown(azimuth)}, expected degrees from 0 to less than 360"
                case _:
                    what = f"{shown(pair)}, expected a pair [azimuth_deg, altitude_deg]"
            wrong.append(((place,), what))
        if wrong:
            raise Misfits(wrong)
        return tuple(skyline)

    @property
    def hours_from_the_sun(self) -> float:
        """How many hours its clocks are from the Sun's mean time, in the better half of a year.

        At most 3 where people live by the Sun at all (the west of China); anything where the
        longitude has the wrong sign, or the zone is that of a clock elsewhere.
        """
        apart_h = []
        for month in (1, 7):
            offset = datetime(2027, month, 1, tzinfo=ZoneInfo(self.timezone)).utcoffset()
            clocks_h = offset.total_seconds() / 3600.0 if offset else 0.0
            apart_h.append(abs((clocks_h - self.longitude_deg / 15.0 + 12.0) % 24.0 - 12.0))
        return min(apart_h)


class Telescope(FileModel):
    """The telescope: its optics, its mount and where it can't go."""

    name: Name = key("the telescope's name, as it goes into the log", min_length=1)
    aperture_m: float = key("diameter of the entrance pupil", unit="m", gt=0, le=50)
    obstruction: float = key("central obstruction as a fraction of the diameter", ge=0, lt=0.95)
    focal_length_m: float = key("effective focal length", unit="m", gt=0, le=500)
    mount: Literal["german", "fork", "altazimuth"] = key("how it is mounted")
    minimum_altitude_deg: float = key("lowest altitude to point at", unit="deg", ge=0, lt=90)
    maximum_altitude_deg: float = key(
        "highest altitude it can track", unit="deg", gt=0, le=90, default=90.0
    )
    hour_angle_limits_h: tuple[float, float] = key(
        "least and greatest hour angle",
        unit="h",
        form="a rising pair of hours from -12 to 12",
        default=(-12.0, 12.0),
    )
    slew_deg_per_s: float = key("slewing speed of each axis", unit="deg/s", gt=0, le=90)
    settle_s: float = key("time to settle after a slew", unit="s", ge=0, le=3600)
    optics_fwhm_arcsec: float = key("blur of the optics, as a FWHM", unit="arcsec", ge=0, le=30)
    tracking_fwhm_arcsec: float = key(
        "blur of tracking and guiding, as a FWHM", unit="arcsec", ge=0, le=30
    )

    dispersion_corrector: bool = key(
        "whether an atmospheric dispersion corrector is in the beam", default=False
    )

    @field_validator("hour_angle_limits_h", mode="before")
    @classmethod
    def _rising_limits(cls, value: object) -> tuple[float, float]:
        match value:
            case (least, most) if is_number(least, -12, 12) and is_number(most, least, 12):
                if least < most:
                    return float(least), float(most)
        raise ValueError(f"{shown(value)}, expected a rising pair of hours from -12 to 12")

    @model_validator(mode="after")
    def _room_between_altitudes(self) -> Self:
        least, most = self.minimum_altitude_deg, self.maximum_altitude_deg
        if least >= most:
            what = f"{least:g}, expected less than maximum_altitude_deg, {most:g}"
            raise Misfits([(("minimum_altitude_deg",), what)])
        return self

    @property
    def collecting_area_m2(self) -> float:
        """Clear area of the pupil, π/4 D² (1 - obstruction²), in square metres."""
        return math.pi / 4.0 * self.aperture_m**2 * (1.0 - self.obstruction**2)


class Camera(FileModel):
    """The detector."""

    pixel_um: float = key("pixel size", unit="um", gt=0, le=100)
    columns: int = key("columns of the detector", ge=1, le=200_000)
    rows: int = key("rows of the detector", ge=1, le=200_000)
    readout_s: float = key("time to read one exposure out", unit="s", ge=0, le=3600)
    read_noise_e: float = key("read noise", unit="electron", ge=0, le=1000)
    dark_e_per_s: float = key(
        "dark current per pixel", unit="electron/s", ge=0, le=10_000, default=0.0
    )
    gain_e_per_adu: float = key("electrons per count", unit="electron/adu", gt=0, le=1000)
    saturation_adu: int = key(
        "count at which a pixel is no longer linear", unit="adu", gt=0, le=10**9
    )


class Filter(FileModel):
    """One filter in the wheel, and the sky and zero point that belong to it."""

    name: Name = key("the name, as plans and the log use it", min_length=1)
    wavelength_nm: float = key("effective wavelength", unit="nm", ge=300, le=1100)
    width_nm: float = key("width at half transmission", unit="nm", gt=0, le=800)
    extinction_mag: float = key("extinction per airmass", unit="mag", ge=0, le=5)
    zero_point_mag: float = key(
        "magnitude that gives 1 electron per second outside the atmosphere",
        unit="mag",
        ge=0,
        le=40,
    )
    dark_sky_mag: float = key(
        "moonless zenith sky per square arcsecond", unit="mag/arcsec2", ge=10, le=30
    )
    change_s: float = key("time to turn this filter in", unit="s", ge=0, le=3600, default=0.0)
    maximum_sun_altitude_deg: float = key(
        "the Sun must be at least this low; common practice, no source",
        unit="deg",
        ge=-18,
        le=0,
        default=-12.0,
    )


class Seeing(FileModel):
    """The site's seeing, used until something is measured."""

    typical_arcsec: float = key(
        "usual seeing at the zenith and 500 nm, as a FWHM", unit="arcsec", ge=0.1, le=20
    )
    outer_scale_m: float | None = key(
        "outer scale of the turbulence; leave out for a Kolmogorov atmosphere",
        unit="m",
        gt=0,
        le=10_000,
        default=None,
    )


class Caution(FileModel):
    """When to warn. Advice on the screen only: the observatory's own rules decide."""

    humidity_percent: float = key("warn above", unit="%", gt=0, le=100, default=85.0)
    wind_m_per_s: float = key("warn above", unit="m/s", gt=0, le=100, default=12.0)
    dew_margin_c: float = key(
        "warn when air is this close to the dew point", unit="deg C", ge=0, le=30, default=2.5
    )
    sun_separation_deg: float = key(
        "never advise pointing this close to the Sun while it is up",
        unit="deg",
        ge=0,
        le=180,
        default=30.0,
    )


class Observatory(FileModel):
    """The whole of ``observatory.toml``."""

    site: Site
    telescope: Telescope
    camera: Camera
    filters: Annotated[
        tuple[Filter, ...], Field(strict=False, min_length=1, max_length=MOST_FILTERS)
    ] = key(
        "the filters in the wheel", form=f"[[filter]] tables, 1 to {MOST_FILTERS}", alias="filter"
    )
    seeing: Seeing
    caution: Caution = Caution()

    @field_validator("filters")
    @classmethod
    def _one_of_each(cls, value: tuple[Filter, ...]) -> tuple[Filter, ...]:
        first: dict[str, int] = {}
        wrong: list[tuple[KeyPath, str]] = []
        for place, each in enumerate(value):
            if first.setdefault(each.name, place) != place:
                what = f"{shown(each.name)} is filter {first[each.name] + 1} already"
                wrong.append(((place, "name"), f"{what}, expected each name once"))
        if wrong:
            raise Misfits(wrong)
        return value

    @property
    def pixel_arcsec(self) -> float:
        """Angular size of one pixel on the sky, p / f, in arcsec."""
        return self.camera.pixel_um * 1e-6 / self.telescope.focal_length_m * ARCSEC_PER_RADIAN

    def filter_named(self, name: str) -> Filter:
        """Return the filter of that name; KeyError when it is not in the wheel."""
        return self.filters[self.filter_index(name)]

    def filter_index(self, name: str) -> int:
        """Return the place of a filter in the wheel; KeyError when it is not there."""
        for index, each in enumerate(self.filters):
            if each.name == name:
                return index
        raise KeyError(name)
