"""The night's image model: sizes, shares of light, and the seeing behind a measured image."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike

from engine.errors import NoAnswer
from engine.image.dispersion import filter_dispersion_arcsec
from engine.image.enclosed import enclosed_share
from engine.image.prepared import Prepared
from engine.image.table import (
    LEAST_SEEING_ARCSEC,
    MOST_AIRMASS,
    MOST_SEEING_ARCSEC,
    Table,
    airmass_position,
    beyond,
    build_table,
    column_at,
    look_up,
    seeing_at_row,
    seeing_position,
)
from engine.image.terms import ImageSize, take_apart
from engine.image.transfer import Blur, Floats, atmosphere_factor
from engine.logbook.observatory import Observatory
from engine.positions.air import Air


class ImageModel:
    """How large star images are through each filter, for one observatory in one night's air.

    Image size is the diameter (arcsec) of the circle as large as the area of the delivered image
    above half its peak: pixel included, the FWHM of a round image. Seeing is always the FWHM in
    arcsec that Kolmogorov turbulence of the same r0 gives at the zenith and 500 nm, as a seeing
    monitor reports it; an outer scale makes images smaller than that. Each filter's table is built
    when first asked for.

    Good to 1 % against two-dimensional convolution for apertures of 0.1 to 4 m, seeing of 0.3 to
    6 arcsec, outer scales from 2 m and airmass to 4. Lower down the air's curvature, which
    dispersion ignores, matters. A filter's light is taken as one wavelength, spread evenly from
    edge to edge by dispersion: right to 1.5 % for the usual broad bands up to airmass 3, too large
    for wider blue ones lower down. The smear is taken as parallel to a side of the pixels. An image
    that is little more than one pixel is a square whose corners any further blur rounds: there,
    below 1.13 pixels, sizes can fall by up to 5 % while seeing grows.
    """

    def __init__(
        self,
        observatory: Observatory,
        air: Air | None = None,
        *,
        dispersion_corrected: bool | None = None,
    ) -> None:
        """Take standard air at the site's height unless ``air`` is given.

        ``dispersion_corrected`` says whether a corrector takes all dispersion away; as the
        observatory's telescope says when None.
        """
        if dispersion_corrected is None:
            dispersion_corrected = observatory.telescope.dispersion_corrector
        self.observatory = observatory
        self.air = air or Air.standard(observatory.site.elevation_m)
        self.dispersion_corrected = dispersion_corrected
        self._tables: dict[int, Table] = {}

    def prepare(self, airmass: ArrayLike, filters: Sequence[int] | None = None) -> Prepared:
        """Place airmasses (any shape, such as (N, T)) in the tables, to be read for any seeing."""
        return Prepared([self.table(index) for index in self._wanted(filters)], airmass)

    def sizes_arcsec(
        self,
        seeing_arcsec: ArrayLike,
        airmass: ArrayLike,
        filters: Sequence[int] | None = None,
    ) -> Floats:
        """Return sizes (F, *broadcast shape) for all filters, or those of the given indices.

        NaN where airmass or seeing is NaN or not positive; see `size_arcsec`.
        """
        seeing = np.asarray(seeing_arcsec, dtype=np.float64)
        row = seeing_position(seeing)
        column = airmass_position(np.asarray(airmass, dtype=np.float64))
        surfaces = [self.table(index).size_arcsec for index in self._wanted(filters)]
        return np.asarray(
            np.stack([look_up(surface, row, column) for surface in surfaces]) * beyond(seeing)
        )

    def size_arcsec(
        self, filter_index: int, seeing_arcsec: ArrayLike, airmass: ArrayLike
    ) -> Floats:
        """Return sizes in arcsec (broadcast shape) through one filter, from its table, to 0.2 %.

        Seeing below 0.1 arcsec counts as that; above 20 arcsec sizes grow in proportion. Airmass
        below 1 counts as 1 and above 40 as 40.
        """
        return np.asarray(self.sizes_arcsec(seeing_arcsec, airmass, (filter_index,))[0])

    def breakdown(self, filter_index: int, seeing_arcsec: float, airmass: float) -> ImageSize:
        """Take one image apart by direct convolution; see `ImageSize`.

        Raises NoAnswer when seeing or airmass is not a positive number (below the horizon).
        """
        return take_apart(self.blur(filter_index, seeing_arcsec, airmass))

    def zenith_seeing_arcsec(
        self, filter_index: int, measured_fwhm_arcsec: float, airmass: float
    ) -> float:
        """Return the zenith seeing at 500 nm (arcsec) that explains a measured image size.

        The inverse of `size_arcsec` through the same table. Raises NoAnswer when the image is
        sharper than the instrument gives in any seeing from 0.1 arcsec up, so near to one pixel
        that two seeings would explain it, or no positive number.
        """
        self._refuse_nonsense("measured image size", measured_fwhm_arcsec)
        self._refuse_nonsense("airmass", airmass)
        sizes = column_at(self.table(filter_index).size_arcsec, airmass)
        smallest = int(np.argmin(sizes))
        said = (
            f"an image of {measured_fwhm_arcsec:.2f} arcsec in "
            f"{self.observatory.filters[filter_index].name} at airmass {airmass:.2f}"
        )
        if measured_fwhm_arcsec < sizes[smallest]:
            raise NoAnswer(
                f"{said} is sharper than this telescope gives in the best seeing "
                f"({sizes[smallest]:.2f} arcsec): check the focal length, the pixel size, and the "
                "optics and tracking terms"
            )
        if measured_fwhm_arcsec < np.max(sizes[: smallest + 1]):
            raise NoAnswer(f"{said} is hardly more than one pixel: it tells nothing of the seeing")
        if measured_fwhm_arcsec > sizes[-1]:
            return float(MOST_SEEING_ARCSEC * measured_fwhm_arcsec / sizes[-1])
        rising = np.maximum.accumulate(sizes[smallest:])
        row = np.interp(measured_fwhm_arcsec, rising, np.arange(smallest, sizes.size))
        return seeing_at_row(float(row))

    def peak_fractions(
        self, filter_index: int, seeing_arcsec: ArrayLike, airmass: ArrayLike
    ) -> Floats:
        """Return the share of a star's light in its brightest pixel, star centred on it.

        From the filter's table, broadcast; NaN as in `size_arcsec`. An upper limit for a star that
        falls between pixels.
        """
        seeing = np.asarray(seeing_arcsec, dtype=np.float64)
        density = look_up(
            self.table(filter_index).peak_per_arcsec2,
            seeing_position(seeing),
            airmass_position(np.asarray(airmass, dtype=np.float64)),
        )
        return np.asarray(
            np.minimum(density / beyond(seeing) ** 2 * self.observatory.pixel_arcsec**2, 1.0)
        )

    def peak_fraction(self, filter_index: int, seeing_arcsec: float, airmass: float) -> float:
        """Return `peak_fractions` of one image."""
        return float(self.peak_fractions(filter_index, seeing_arcsec, airmass))

    def enclosed(
        self, filter_index: int, seeing_arcsec: float, airmass: float, radius_arcsec: float
    ) -> float:
        """Return the share of a star's light within a radius (arcsec), by direct transform.

        Raises NoAnswer when seeing or airmass is not a positive number (below the horizon).
        """
        return enclosed_share(self.blur(filter_index, seeing_arcsec, airmass), radius_arcsec)

    def blur(self, filter_index: int, seeing_arcsec: float, airmass: float) -> Blur:
        """Return all that blurs one image: for direct convolution, and for second opinions."""
        self._refuse_nonsense("seeing", seeing_arcsec)
        self._refuse_nonsense("airmass", airmass)
        telescope = self.observatory.telescope
        wavelength_nm = self.observatory.filters[filter_index].wavelength_nm
        bounded = min(max(airmass, 1.0), MOST_AIRMASS)
        factor = float(atmosphere_factor(wavelength_nm, np.asarray(bounded)))
        return Blur(
            wavelength_nm=wavelength_nm,
            aperture_m=telescope.aperture_m,
            obstruction=telescope.obstruction,
            atmosphere_arcsec=max(seeing_arcsec, LEAST_SEEING_ARCSEC) * factor,
            outer_scale_m=self.observatory.seeing.outer_scale_m,
            optics_arcsec=telescope.optics_fwhm_arcsec,
            tracking_arcsec=telescope.tracking_fwhm_arcsec,
            dispersion_arcsec=float(self._dispersion_arcsec(filter_index, bounded)),
            pixel_arcsec=self.observatory.pixel_arcsec,
        )

    def table(self, filter_index: int) -> Table:
        """Return the table of one filter, built on first use (about 40 ms)."""
        table = self._tables.get(filter_index)
        if table is None:
            fixed = self.blur(filter_index, 1.0, 1.0)
            table = build_table(fixed, lambda x: self._dispersion_arcsec(filter_index, x))
            self._tables[filter_index] = table
        return table

    def _wanted(self, filters: Sequence[int] | None) -> Sequence[int]:
        return range(len(self.observatory.filters)) if filters is None else filters

    def _dispersion_arcsec(self, filter_index: int, airmass: ArrayLike) -> Floats:
        return filter_dispersion_arcsec(
            self.observatory.filters[filter_index],
            airmass,
            self.air,
            corrected=self.dispersion_corrected,
        )

    @staticmethod
    def _refuse_nonsense(what: str, value: float) -> None:
        if not (math.isfinite(value) and value > 0.0):
            raise NoAnswer(f"{what} {value:g}: there is no image to speak of")
