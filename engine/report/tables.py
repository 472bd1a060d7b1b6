"""The night's exposures as a table for reduction: units, descriptions, times as ISO and JD.

A value that was never known is masked, not a number that could be taken for one.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Any

from engine.log import Exposure
from engine.report.night import NightReport
from engine.times import datetime_from_mjd

if TYPE_CHECKING:
    from astropy.table import Table

# Of a JD and an MJD, by definition of the second.
JD_OF_MJD = 2400000.5


@dataclass(frozen=True, slots=True)
class Field:
    """One column: its name, the exposure's field behind it, its unit, and what it means."""

    name: str
    field: str
    unit: str
    meaning: str
    kind: type = float


FIELDS: tuple[Field, ...] = (
    Field("entry", "n", "", "number of the entry in the night's log", int),
    Field("frame", "frame", "", "file name of the frame, if it was entered", str),
    Field("target", "target", "", "target", str),
    Field("programme", "programme", "", "programme", str),
    Field("filter", "filter", "", "filter", str),
    Field("planned_s", "seconds", "s", "planned length"),
    Field("exposed_s", "exposed_s", "s", "open shutter"),
    Field("airmass_start", "airmass_start", "", "airmass when the shutter opened"),
    Field("airmass_mid", "airmass_mid", "", "airmass at the middle"),
    Field("airmass_end", "airmass_end", "", "airmass when the shutter closed"),
    Field("airmass_effective", "airmass_effective", "", "airmass averaged over the exposure"),
    Field("altitude", "altitude_deg", "deg", "geometric altitude at the middle"),
    Field("azimuth", "azimuth_deg", "deg", "azimuth at the middle, north through east"),
    Field("hour_angle", "hour_angle_h", "h", "hour angle at the middle, west positive"),
    Field("moon_separation", "moon_separation_deg", "deg", "distance to the Moon at the middle"),
    Field("moon_altitude", "moon_altitude_deg", "deg", "altitude of the Moon at the middle"),
    Field("moon_illumination", "moon_illumination", "", "lit share of the Moon, 0 to 1"),
    Field("fwhm_predicted", "image_size_arcsec", "arcsec", "predicted size of star images, FWHM"),
    Field("fwhm_measured", "measured_fwhm_arcsec", "arcsec", "measured size, FWHM"),
    Field("seeing_zenith", "seeing_arcsec", "arcsec", "seeing in force, zenith at 500 nm, FWHM"),
    Field("sky", "sky_mag_arcsec2", "mag / arcsec2", "predicted brightness of the sky"),
    Field("credit", "credit", "", "what it is worth, as a share of a planned exposure"),
    Field("outcome", "outcome", "", "good, rejected, stopped or cut_off", str),
    Field("why", "why", "", "why it ended or was judged so", str),
)
# The three moments of an exposure, as two columns each.
MOMENTS = (("start", "start_mjd"), ("mid", "mid_mjd"), ("end", "end_mjd"))
# Where they stand among the others.
AFTER = "exposed_s"


def iso_utc(mjd: float) -> str:
    """Return a moment (UTC MJD) as FITS wants it: ISO 8601 to the millisecond, without a zone."""
    return datetime_from_mjd(mjd).strftime("%Y-%m-%dT%H:%M:%S.%f")[:-3]


def exposure_table(report: NightReport) -> Table:
    """Return the exposures as an astropy table; whose and which night stands in its ``meta``."""
    from astropy.table import Table

    table = Table(
        meta={
            "night": report.night.isoformat(),
            "site": report.site.name if report.site else "",
            "observers": ", ".join(report.header.observers),
            "software": report.header.software,
            "time_scale": "UTC",
        }
    )
    for each in FIELDS:
        table[each.name] = _column(report.exposures, each)
        if each.name == AFTER:
            for name, field in MOMENTS:
                _add_moment(table, report.exposures, name, field)
    return table


def _column(exposures: tuple[Exposure, ...], field: Field) -> Any:
    from astropy.table import Column, MaskedColumn

    values = [getattr(each, field.field) for each in exposures]
    about = {"name": field.name, "unit": field.unit or None, "description": field.meaning}
    if field.kind is str:
        return Column([str(value) for value in values], dtype="U", **about)
    if field.kind is int:
        return Column(values, dtype="i8", **about)
    known = [0.0 if value is None else float(value) for value in values]
    return MaskedColumn(known, mask=[value is None for value in values], dtype="f8", **about)


def _add_moment(table: Table, exposures: tuple[Exposure, ...], name: str, field: str) -> None:
    from astropy.table import Column

    moments = [float(getattr(each, field)) for each in exposures]
    what = {"start": "when the shutter opened", "mid": "the middle", "end": "when it closed"}[name]
    table[f"{name}_utc"] = Column(
        [iso_utc(mjd) for mjd in moments], dtype="U23", description=f"{what}, UTC, ISO 8601"
    )
    table[f"{name}_jd"] = Column(
        [mjd + JD_OF_MJD for mjd in moments],
        dtype="f8",
        unit="d",
        description=f"{what}, Julian date, UTC, at the telescope",
    )
