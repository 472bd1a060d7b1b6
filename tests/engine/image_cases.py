"""Cases for the tests of image size: made-up observatories, and GalSim's opinion of an image."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import galsim
import numpy as np
from scipy import ndimage

from engine.image import ImageModel
from engine.image.transfer import Blur, fried_parameter_m
from engine.logbook.observatory import ARCSEC_PER_RADIAN, Observatory
from engine.positions.air import Air

DEMO_FILTERS = (("B", 435.0, 90.0), ("V", 550.0, 88.0), ("R", 640.0, 130.0), ("I", 800.0, 150.0))


def an_observatory(
    *,
    pixel_arcsec: float = 0.55,
    filters: tuple[tuple[str, float, float], ...] = DEMO_FILTERS,
    outer_scale_m: float | None = None,
    **telescope: Any,
) -> Observatory:
    """Return an invented observatory at 2000 m; ``filters`` are (name, nm, width in nm)."""
    optics: dict[str, Any] = {
        "aperture_m": 0.5,
        "obstruction": 0.35,
        "optics_fwhm_arcsec": 0.4,
        "tracking_fwhm_arcsec": 0.3,
    }
    focal_length_m = 3.4
    return Observatory.model_validate(
        {
            "site": {
                "name": "Slate Ridge",
                "latitude_deg": 38.0,
                "longitude_deg": -3.0,
                "elevation_m": 2000.0,
                "timezone": "Europe/Madrid",
            },
            "telescope": {
                "name": "the half-metre",
                "focal_length_m": focal_length_m,
                "mount": "fork",
                "minimum_altitude_deg": 15.0,
                "slew_deg_per_s": 2.0,
                "settle_s": 5.0,
                **optics,
                **telescope,
            },
            "camera": {
                "pixel_um": pixel_arcsec / ARCSEC_PER_RADIAN * focal_length_m * 1e6,
                "columns": 2048,
                "rows": 2048,
                "readout_s": 10.0,
                "read_noise_e": 8.0,
                "gain_e_per_adu": 1.2,
                "saturation_adu": 60000,
            },
            "filter": [
                {
                    "name": name,
                    "wavelength_nm": wavelength_nm,
                    "width_nm": width_nm,
                    "extinction_mag": 0.2,
                    "zero_point_mag": 22.0,
                    "dark_sky_mag": 21.0,
                }
                for name, wavelength_nm, width_nm in filters
            ],
            "seeing": {"typical_arcsec": 1.2, "outer_scale_m": outer_scale_m},
        }
    )


@dataclass(frozen=True, slots=True)
class Case:
    """One instrument with one filter, one seeing and one airmass."""

    model: ImageModel
    seeing_arcsec: float
    airmass: float

    @property
    def predicted_arcsec(self) -> float:
        """The size from the model's table, as the console shows it."""
        return float(self.model.size_arcsec(0, self.seeing_arcsec, self.airmass))

    @property
    def blur(self) -> Blur:
        """What blurs this image."""
        return self.model.blur(0, self.seeing_arcsec, self.airmass)


def random_case(rng: np.random.Generator) -> Case:
    """Draw a case from the whole domain the model is meant for, mostly log-uniformly."""

    def between(low: float, high: float) -> float:
        return float(np.exp(rng.uniform(np.log(low), np.log(high))))

    observatory = an_observatory(
        aperture_m=between(0.1, 4.0),
        obstruction=float(rng.uniform(0.0, 0.5)),
        optics_fwhm_arcsec=float(rng.choice([0.0, rng.uniform(0.0, 1.0)])),
        tracking_fwhm_arcsec=float(rng.choice([0.0, rng.uniform(0.0, 0.7)])),
        pixel_arcsec=between(0.1, 3.0),
        filters=(("F", float(rng.uniform(350.0, 1000.0)), between(5.0, 150.0)),),
        outer_scale_m=None if rng.random() < 0.5 else between(10.0, 50.0),
    )
    model = ImageModel(observatory, Air(between(600.0, 1013.0), 10.0, 50.0))
    return Case(model, between(0.3, 6.0), float(rng.uniform(1.0, 4.0)))


def galsim_profile(blur: Blur, pixel_angle_deg: float = 0.0) -> Any:
    """Return GalSim's convolution of all blurs, the smear along x."""
    wide = galsim.GSParams(maximum_fft_size=16384)
    if blur.outer_scale_m is None:
        parts = [galsim.Kolmogorov(fwhm=blur.atmosphere_arcsec)]
    else:
        r0_m = fried_parameter_m(blur.atmosphere_arcsec, blur.wavelength_nm)
        parts = [galsim.VonKarman(lam=blur.wavelength_nm, r0=r0_m, L0=blur.outer_scale_m)]
    parts.append(
        galsim.Airy(lam=blur.wavelength_nm, diam=blur.aperture_m, obscuration=blur.obstruction)
    )
    for fwhm_arcsec in (blur.optics_arcsec, blur.tracking_arcsec):
        if fwhm_arcsec > 0.0:
            parts.append(galsim.Gaussian(fwhm=fwhm_arcsec))
    if blur.dispersion_arcsec > 1e-6:
        parts.append(galsim.Box(blur.dispersion_arcsec, 1e-4 * blur.dispersion_arcsec))
    parts.append(galsim.Pixel(blur.pixel_arcsec).rotate(pixel_angle_deg * galsim.degrees))
    return galsim.Convolve([part.withGSParams(wide) for part in parts], gsparams=wide)


def galsim_size_arcsec(blur: Blur, expected_arcsec: float, pixel_angle_deg: float = 0.0) -> float:
    """Return the size by GalSim: drawn 30 times finer than the image, and six times finer again.

    ``expected_arcsec`` only sets the scale of the drawing.
    """
    scale = expected_arcsec / 30.0
    extent = 1.2 * (blur.dispersion_arcsec + math.sqrt(2.0) * blur.pixel_arcsec + expected_arcsec)
    across = max(int(extent / scale) | 1, 65)
    drawn = galsim_profile(blur, pixel_angle_deg).drawImage(
        nx=across, ny=across, scale=scale, method="no_pixel", dtype=float
    )
    fine = ndimage.zoom(drawn.array, 6, order=3)
    step = scale * (across - 1) / (fine.shape[0] - 1)
    area = np.count_nonzero(fine > 0.5 * fine.max()) * step**2
    return 2.0 * math.sqrt(area / math.pi)
