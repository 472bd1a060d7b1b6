"""Image sizes of one filter for the whole night: tabulated once, looked up by the million.

Everything but seeing and airmass is fixed for a night, so each filter's sizes are a smooth surface
over (ln seeing, q), where q = asinh(8 tan z) is even near the zenith and logarithmic low down.
Direct convolutions on a coarse grid of (atmospheric FWHM, q), where they share their transfer
functions, are splined onto a fine grid of (seeing, q) that linear interpolation can read.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.image.contour import sizes_and_peaks
from engine.image.dispersion import tan_zenith_distance
from engine.image.spline import spline
from engine.image.transfer import Blur, Floats, atmosphere_factor

LEAST_SEEING_ARCSEC = 0.1
MOST_SEEING_ARCSEC = 20.0
MOST_AIRMASS = 40.0
"""Above every model's horizon (Pickering's is 38.7); airmasses beyond are taken as this."""

_STRETCH = 8.0
_LN_LEAST, _LN_MOST = math.log(LEAST_SEEING_ARCSEC), math.log(MOST_SEEING_ARCSEC)
_MOST_Q = math.asinh(_STRETCH * math.sqrt(MOST_AIRMASS**2 - 1.0))

SEEING_ROWS, AIRMASS_COLUMNS = 134, 130
"""Steps of 0.04 in ln seeing and 0.05 in q: linear interpolation errs by less than 0.05 %."""

COARSE_ROWS, COARSE_COLUMNS = 24, 26
"""Steps of about 0.33 in ln FWHM and 0.26 in q, for cubic splines."""


@dataclass(frozen=True, slots=True)
class Position:
    """Where values fall on one axis of the table: the cell below and the way into it, 0 to 1.

    ``weight`` is NaN where there is nothing to look up.
    """

    cell: NDArray[np.intp]
    weight: Floats


def _position(coordinate: Floats, last_cell: int) -> Position:
    valid = ~np.isnan(coordinate)
    cell = np.where(valid, coordinate, 0.0).astype(np.intp)
    np.minimum(cell, last_cell, out=cell)
    return Position(cell, coordinate - cell)


def seeing_position(seeing_arcsec: Floats) -> Position:
    """Place zenith seeings (arcsec) on the table's rows; NaN or not positive gives NaN.

    Values beyond the table count as its ends; `beyond` says what to do above.
    """
    step = (_LN_MOST - _LN_LEAST) / (SEEING_ROWS - 1)
    clipped = np.clip(seeing_arcsec, LEAST_SEEING_ARCSEC, MOST_SEEING_ARCSEC)
    rows = (np.log(clipped) - _LN_LEAST) / step
    return _position(np.where(seeing_arcsec > 0.0, rows, np.nan), SEEING_ROWS - 2)


def beyond(seeing_arcsec: Floats) -> Floats:
    """Return the factor on sizes above the table, where the atmosphere is all there is."""
    return np.asarray(np.maximum(seeing_arcsec / MOST_SEEING_ARCSEC, 1.0))


def airmass_position(airmass: Floats) -> Position:
    """Place airmasses on the table's columns; NaN or not positive gives NaN, below 1 counts as 1.

    Airmasses above 40 count as 40.
    """
    step = _MOST_Q / (AIRMASS_COLUMNS - 1)
    clipped = np.minimum(airmass, MOST_AIRMASS)
    columns = np.arcsinh(_STRETCH * tan_zenith_distance(clipped)) / step
    return _position(np.where(airmass > 0.0, columns, np.nan), AIRMASS_COLUMNS - 2)


@dataclass(frozen=True, slots=True)
class Table:
    """Sizes (arcsec) and central intensities of one filter, (SEEING_ROWS, AIRMASS_COLUMNS)."""

    size_arcsec: Floats
    peak_per_arcsec2: Floats


def build_table(blur: Blur, dispersion_arcsec: Callable[[ArrayLike], Floats]) -> Table:
    """Tabulate one filter: its fixed blurs, and how its dispersion grows with airmass.

    The atmosphere and dispersion in ``blur`` are ignored.
    """
    coarse_q = np.linspace(0.0, _MOST_Q, COARSE_COLUMNS)
    fine_q = np.linspace(0.0, _MOST_Q, AIRMASS_COLUMNS)
    factor = atmosphere_factor(blur.wavelength_nm, _airmass_at(fine_q))
    ln_least = _LN_LEAST + math.log(factor[0])
    ln_most = _LN_MOST + math.log(factor[-1])
    coarse_ln = np.linspace(ln_least, ln_most, COARSE_ROWS)
    smears = dispersion_arcsec(_airmass_at(coarse_q))
    computed = [
        sizes_and_peaks(replace(blur, atmosphere_arcsec=float(each)), smears)
        for each in np.exp(coarse_ln)
    ]
    ln_sizes, ln_peaks = np.log(np.array(computed)).transpose(1, 0, 2)
    fine_ln = np.linspace(_LN_LEAST, _LN_MOST, SEEING_ROWS)
    rows = (fine_ln[:, None] + np.log(factor) - ln_least) / (coarse_ln[1] - coarse_ln[0])
    columns = fine_q / (coarse_q[1] - coarse_q[0])

    def refined(coarse: Floats) -> Floats:
        return np.asarray(np.exp(spline(spline(coarse.T, columns).T, rows)))

    return Table(refined(ln_sizes), refined(ln_peaks))


def _airmass_at(q: Floats) -> Floats:
    return np.asarray(np.sqrt(1.0 + (np.sinh(q) / _STRETCH) ** 2))


def look_up(surface: Floats, row: Position, column: Position) -> Floats:
    """Return a table's surface at positions that broadcast, by bilinear interpolation."""
    flat = surface.ravel()
    corner = row.cell * surface.shape[1] + column.cell

    def along_row() -> Floats:
        left, right = flat.take(corner), flat.take(corner + 1)
        return np.asarray(left + (right - left) * column.weight)

    upper = along_row()
    corner += surface.shape[1]
    return np.asarray(upper + (along_row() - upper) * row.weight)


def column_at(surface: Floats, airmass: float) -> Floats:
    """Return one column (SEEING_ROWS,) of the surface, at a single airmass."""
    position = airmass_position(np.asarray(airmass))
    rows = Position(np.arange(SEEING_ROWS - 1), np.zeros(SEEING_ROWS - 1))
    last = Position(np.array([SEEING_ROWS - 2]), np.ones(1))
    return np.concatenate([look_up(surface, each, position) for each in (rows, last)])


def seeing_at_row(row: float) -> float:
    """Return the zenith seeing (arcsec) of a row, whole or between two."""
    return math.exp(_LN_LEAST + row * (_LN_MOST - _LN_LEAST) / (SEEING_ROWS - 1))
