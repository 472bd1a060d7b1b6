"""Sizes of all targets at all minutes, again and again as the seeing changes."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import ArrayLike, NDArray

from engine.image.table import (
    AIRMASS_COLUMNS,
    Position,
    Table,
    airmass_position,
    beyond,
    seeing_position,
)

Singles = NDArray[np.float32]


class Prepared:
    """An array of airmasses placed in the tables once, whatever the seeing will be.

    What remains for a new seeing is to draw each minute's row of each table and to read two
    neighbours of it for each target.
    """

    def __init__(self, tables: Sequence[Table], airmass: ArrayLike) -> None:
        column = airmass_position(np.atleast_1d(np.asarray(airmass, dtype=np.float64)))
        self._cell = column.cell
        self._weight: Singles = column.weight.astype(np.float32)
        self._tables = [table.size_arcsec.astype(np.float32) for table in tables]
        minutes = np.arange(column.cell.shape[-1]) * AIRMASS_COLUMNS
        self._cell_of_minute = column.cell + minutes

    def sizes_arcsec(self, seeing_arcsec: ArrayLike) -> Singles:
        """Return the sizes (F, *airmass.shape) in arcsec, to 0.1 %.

        ``seeing_arcsec``, at the zenith and 500 nm, is one value for all or one for each place (T,)
        on the airmasses' last axis. NaN where airmass or seeing is NaN or not positive.
        """
        seeing = np.asarray(seeing_arcsec, dtype=np.float64)
        minutes = self._cell.shape[-1]
        if seeing.ndim > 1 or seeing.size not in (1, minutes):
            raise ValueError(f"seeing of shape {seeing.shape}, expected one value or {minutes}")
        cell = self._cell if seeing.size == 1 else self._cell_of_minute
        flat_seeing = np.atleast_1d(seeing)
        row = seeing_position(flat_seeing)
        scale = beyond(flat_seeing)[:, None]
        out = np.empty((len(self._tables), *cell.shape), dtype=np.float32)
        for sizes, table in zip(out, self._tables, strict=True):
            pairs = _with_slopes(table, row, scale).take(cell, mode="clip")
            np.multiply(pairs.imag, self._weight, out=sizes)
            np.add(sizes, pairs.real, out=sizes)
        return out


def _with_slopes(
    table: Singles, row: Position, scale: NDArray[np.float64]
) -> NDArray[np.complex64]:
    """Return the table's rows (T, AIRMASS_COLUMNS) at these seeings, flat.

    The imaginary part is the step to the next column: one complex number brings both to where
    they are needed in a single read, which is twice as fast as two.
    """
    weight = row.weight[:, None].astype(np.float32)
    rows = table[row.cell]
    rows += (table[row.cell + 1] - rows) * weight
    rows *= scale.astype(np.float32)
    pairs = np.zeros(rows.shape, dtype=np.complex64)
    pairs.real = rows
    pairs.imag[:, :-1] = np.diff(rows, axis=1)
    return pairs.ravel()
