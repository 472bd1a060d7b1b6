"""What an exposure of a target in a filter will reach, at one moment, in the predicted image."""

from __future__ import annotations

import math
from dataclasses import dataclass

from engine.errors import NoAnswer
from engine.image import ImageModel
from engine.light import Aperture, Conditions, ExposureModel, Subexposures
from engine.logbook import Observatory

# The signal-to-noise at which a star counts as seen: common practice, no source.
LIMIT_SIGNAL_TO_NOISE = 5.0


@dataclass(frozen=True, slots=True)
class Scene:
    """What an exposure meets: the filter's place in the wheel, zenith seeing, airmass, sky."""

    filter_index: int
    seeing_arcsec: float
    airmass: float
    sky_mag_arcsec2: float


@dataclass(frozen=True, slots=True)
class Reach:
    """What one exposure reaches. Times in seconds, sizes in arcsec.

    ``signal_to_noise``, ``saturation_s`` and ``seconds_for_100`` are of a star of ``magnitude``,
    NaN when none is given; ``limiting_magnitude`` is for a signal-to-noise of 5.
    """

    seconds: float
    magnitude: float
    image_size_arcsec: float
    aperture_radius_arcsec: float
    signal_to_noise: float
    seconds_for_100: float
    limiting_magnitude: float
    saturation_s: float
    sky_limited_s: float
    parts: Subexposures

    @property
    def saturates(self) -> bool:
        """Whether the star's brightest pixel saturates within the exposure."""
        return self.saturation_s < self.seconds


def reach(
    observatory: Observatory,
    model: ImageModel,
    scene: Scene,
    seconds: float,
    magnitude: float | None,
) -> Reach:
    """Return what an exposure (s) reaches; NoAnswer when there is no image to expose."""
    if not (math.isfinite(scene.airmass) and math.isfinite(scene.sky_mag_arcsec2)):
        raise NoAnswer("the target is below the horizon")
    where = (scene.filter_index, scene.seeing_arcsec, scene.airmass)
    size_arcsec = float(model.size_arcsec(*where))
    aperture = Aperture.best(size_arcsec, lambda radius: model.enclosed(*where, radius))
    seen = Conditions(scene.airmass, scene.sky_mag_arcsec2, aperture)
    exposure = ExposureModel.of(observatory, scene.filter_index)
    star = math.nan if magnitude is None else magnitude
    saturation_s = float(
        exposure.saturation_s(
            star, scene.airmass, scene.sky_mag_arcsec2, model.peak_fraction(*where)
        )
    )
    return Reach(
        seconds=seconds,
        magnitude=star,
        image_size_arcsec=size_arcsec,
        aperture_radius_arcsec=float(aperture.radius_arcsec),  # type: ignore[arg-type]
        signal_to_noise=float(exposure.signal_to_noise(star, seconds, seen)),
        seconds_for_100=float(exposure.seconds_for(100.0, star, seen)),
        limiting_magnitude=float(exposure.limiting_magnitude(LIMIT_SIGNAL_TO_NOISE, seconds, seen)),
        saturation_s=saturation_s,
        sky_limited_s=float(exposure.sky_limited_s(scene.sky_mag_arcsec2)),
        parts=exposure.best_subexposures(
            seconds,
            scene.sky_mag_arcsec2,
            longest_s=saturation_s if math.isfinite(saturation_s) else math.inf,
        ),
    )
