"""The full record of one exposure, written when it ends, so that it can be reduced next year."""

from __future__ import annotations

import math
from dataclasses import dataclass, fields, replace
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from engine.image import ImageModel, ImageSize, Terms
from engine.light import MoonLight, Reference, credit, sky_mag_arcsec2
from engine.log import Exposure, OpenExposure
from engine.night import Night
from engine.positions import (
    airmass,
    apparent_altitude_deg,
    effective_airmass,
    horizontal,
    moon,
    separation_deg,
    sun,
)
from engine.times import SECONDS_PER_DAY

if TYPE_CHECKING:
    from engine.watch.planning import Planner


@dataclass(frozen=True, slots=True)
class Ending:
    """How an exposure ended: when (UTC MJD), with which outcome, and why, in words."""

    end_mjd: float
    outcome: str
    why: str = ""


def exposure_record(
    night: Night, model: ImageModel, began: OpenExposure, ending: Ending, seeing_arcsec: float
) -> Exposure:
    """Return the record of an exposure: where, how high, how soft, how bright a sky, what worth.

    Everything is worked out afresh at its start, middle and end, not read from the minute grid.
    ``seeing_arcsec`` is the seeing in force, zenith and 500 nm. Of a target or filter that has left
    the logbook since, only what happened is recorded.
    """
    bare = _bare_record(began, ending)
    try:
        index = night.target_index(began.target)
        place = night.observatory.filter_index(began.filter)
    except KeyError:
        return bare
    sight = _sight(night, index, place, np.array([bare.start_mjd, bare.mid_mjd, bare.end_mjd]))
    image = _image(model, place, seeing_arcsec, sight.airmass[1])
    reference = Reference.of(night.observatory, model, place)
    filter_ = night.observatory.filters[place]
    worth = float(
        credit(image.size_arcsec, sight.sky_mag_arcsec2, sight.airmass[1], filter_, reference)
    )
    return replace(
        bare,
        airmass_start=_kept(sight.airmass[0]),
        airmass_mid=_kept(sight.airmass[1]),
        airmass_end=_kept(sight.airmass[2]),
        airmass_effective=_kept(float(effective_airmass(*sight.airmass))),
        altitude_deg=_kept(sight.altitude_deg),
        azimuth_deg=_kept(sight.azimuth_deg),
        hour_angle_h=_kept(sight.hour_angle_h),
        moon_separation_deg=_kept(sight.moon_separation_deg),
        moon_altitude_deg=_kept(sight.moon_altitude_deg),
        moon_illumination=_kept(sight.moon_illumination),
        image_size_arcsec=_kept(image.size_arcsec),
        image_atmosphere_arcsec=_kept(image.terms.atmosphere),
        image_diffraction_arcsec=_kept(image.terms.diffraction),
        image_optics_arcsec=_kept(image.terms.optics),
        image_tracking_arcsec=_kept(image.terms.tracking),
        image_dispersion_arcsec=_kept(image.terms.dispersion),
        image_sampling_arcsec=_kept(image.terms.sampling),
        sky_mag_arcsec2=_kept(sight.sky_mag_arcsec2),
        seeing_arcsec=_kept(seeing_arcsec),
        credit=_kept(worth * min(bare.exposed_s / bare.seconds, 1.0)),
    )


def _bare_record(began: OpenExposure, ending: Ending) -> Exposure:
    """Return what happened in an exposure, without anything that is worked out."""
    return Exposure(
        of=began.n,
        run=began.run,
        target=began.target,
        programme=began.programme,
        filter=began.filter,
        seconds=began.seconds,
        exposed_s=round((ending.end_mjd - began.start_mjd) * SECONDS_PER_DAY, 3),
        start_mjd=began.start_mjd,
        mid_mjd=0.5 * (began.start_mjd + ending.end_mjd),
        end_mjd=ending.end_mjd,
        frame=began.frame,
        outcome=ending.outcome,
        why=ending.why,
    )


@dataclass(frozen=True, slots=True)
class _Sight:
    """Where an exposure looked: ``airmass`` at its start, middle and end, the rest at its middle.

    NaN for what there is none of below the horizon.
    """

    airmass: tuple[float, float, float]
    altitude_deg: float
    azimuth_deg: float
    hour_angle_h: float
    moon_separation_deg: float
    moon_altitude_deg: float
    moon_illumination: float
    sky_mag_arcsec2: float


def _sight(night: Night, index: int, place: int, mjd: NDArray[np.float64]) -> _Sight:
    """Return where an exposure of a target looked; ``mjd`` (3,) UTC at start, middle and end."""
    site = night.observatory.site
    where = horizontal(night.places.only(index), mjd, site)
    masses = airmass(
        apparent_altitude_deg(where.altitude_deg[0], night.air), site.airmass_model, night.air
    )
    the_moon = moon(mjd, site)
    from_moon_deg = separation_deg(
        night.places.ra_deg[index], night.places.dec_deg[index],
        the_moon.ra_deg[1], the_moon.dec_deg[1],
    )  # fmt: skip
    sky = sky_mag_arcsec2(
        night.observatory.filters[place],
        altitude_deg=where.altitude_deg[0, 1],
        sun_altitude_deg=sun(mjd, site).altitude_deg[1],
        moon=MoonLight(
            altitude_deg=the_moon.altitude_deg[1],
            separation_deg=from_moon_deg,
            phase_angle_deg=the_moon.phase_angle_deg[1],
        ),
        pressure_hpa=night.air.pressure_hpa,
    )
    return _Sight(
        airmass=(float(masses[0]), float(masses[1]), float(masses[2])),
        altitude_deg=float(where.altitude_deg[0, 1]),
        azimuth_deg=float(where.azimuth_deg[0, 1]),
        hour_angle_h=float(where.hour_angle_h[0, 1]),
        moon_separation_deg=float(from_moon_deg),
        moon_altitude_deg=float(the_moon.altitude_deg[1]),
        moon_illumination=float(the_moon.illumination[1]),
        sky_mag_arcsec2=float(sky),
    )


def _image(model: ImageModel, place: int, seeing_arcsec: float, airmass_mid: float) -> ImageSize:
    """Return the predicted image; one of NaNs for a target below the horizon, which has none."""
    if math.isfinite(airmass_mid):
        return model.breakdown(place, seeing_arcsec, airmass_mid)
    nothing = Terms(*[math.nan] * len(fields(Terms)))
    return ImageSize(math.nan, math.nan, math.nan, nothing, nothing, False)


def _kept(value: float) -> float | None:
    """Return a number as the log keeps it: four places; None for what is not a number.

    A target below the horizon has no airmass and no image: such keys are left out.
    """
    return round(float(value), 4) if math.isfinite(value) else None


def credit_measured(planner: Planner, exposure: Exposure, measured_fwhm_arcsec: float) -> float:
    """Return what an exposure is worth with the FWHM (arcsec) that was measured on it."""
    observatory = planner.logbook.observatory
    place = observatory.filter_index(exposure.filter)
    reference = Reference.of(observatory, planner.model, place)
    sky = exposure.sky_mag_arcsec2 or reference.sky_mag_arcsec2
    airmass_mid = exposure.airmass_mid or reference.airmass
    worth = credit(measured_fwhm_arcsec, sky, airmass_mid, observatory.filters[place], reference)
    return round(float(worth) * min(exposure.exposed_s / exposure.seconds, 1.0), 4)
