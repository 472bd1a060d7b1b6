"""When in the night a target may be observed: stretches between its limits, and what ends each."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.night.reasons import Reason, reasons_in
from engine.night.tables import Night


@dataclass(frozen=True, slots=True)
class Stretch:
    """A stretch of time (UTC MJD) within all limits.

    ``end_mjd`` is the first minute after it, at which ``ended_by`` holds; that is None when the
    night's tables end first.
    """

    begin_mjd: float
    end_mjd: float
    ended_by: Reason | None


def stretches(night: Night, index: int) -> tuple[Stretch, ...]:
    """Return every stretch in which a target (by its place in the list) breaks no limit.

    Limits that depend on the seeing or on the observer are not in it.
    """
    return tuple(
        Stretch(
            float(night.mjd[first]),
            float(night.mjd[min(after, night.last)]),
            reasons_in(int(night.limits[index, after]))[0] if after <= night.last else None,
        )
        for first, after in runs(night.limits[index] == 0)
    )


def runs(mask: NDArray[np.bool_]) -> list[tuple[int, int]]:
    """Return where a mask (T,) holds without a break, as pairs (first place, place after)."""
    edges = np.flatnonzero(np.diff(np.concatenate(([False], mask, [False])).astype(np.int8)))
    return [(int(first), int(after)) for first, after in zip(edges[::2], edges[1::2], strict=True)]
