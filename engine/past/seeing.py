"""The site's seeing as many nights measured it: by month, hour, filter and airmass.

All values are zenith seeing at 500 nm in arcsec, as the logs hold them.
"""

from __future__ import annotations

import itertools
import json
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.past.digest import SEEING_COLUMNS, table
from engine.past.index import PastIndex
from engine.past.nights import ALWAYS, Period
from engine.seeing import SeeingSummary

Floats = NDArray[np.float64]

AIRMASS_EDGES = (1.0, 1.2, 1.5, 2.0, 3.0, np.inf)
# Width of the bins of the distribution; what is worse than the last edge counts in the last bin.
BIN_ARCSEC, LAST_ARCSEC = 0.25, 5.0
MONTHS = (
    "January", "February", "March", "April", "May", "June",
    "July", "August", "September", "October", "November", "December",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class Group:
    """The seeing of one month, hour, filter or span of airmass, in a few numbers."""

    label: str
    summary: SeeingSummary


@dataclass(frozen=True, slots=True)
class SiteSeeing:
    """What many nights say of a site's seeing.

    ``counts`` of the distribution lie between ``edges_arcsec`` (one more of them); the last bin
    holds all that is worse. ``from_images`` of the measurements follow from an image's FWHM, the
    rest was entered as seeing.
    """

    nights: int
    from_images: int
    all: SeeingSummary | None
    by_month: tuple[Group, ...]
    by_hour: tuple[Group, ...]
    by_filter: tuple[Group, ...]
    by_airmass: tuple[Group, ...]
    edges_arcsec: tuple[float, ...]
    counts: tuple[int, ...]


@dataclass(frozen=True, slots=True)
class Measurements:
    """All measured seeing of some nights as columns (M,); NaN and -1 for what is not known."""

    mjd: Floats
    zenith_arcsec: Floats
    local_h: Floats
    airmass: Floats
    measured_arcsec: Floats
    night: NDArray[np.intp]
    filter: NDArray[np.intp]
    nights: tuple[str, ...]
    filters: tuple[str, ...]

    @property
    def from_image(self) -> NDArray[np.bool_]:
        """Which follow from an image's FWHM."""
        return ~np.isnan(self.measured_arcsec)


def tables_of(
    index: PastIndex, column: str, columns: Sequence[str], period: Period
) -> tuple[Floats, NDArray[np.intp], tuple[str, ...], tuple[str, ...]]:
    """Return the rows of all nights' tables of numbers together, the oldest night first.

    With them the night of each row as a place among the nights' names, and the names of filters,
    to which the column ``filter`` then points.
    """
    found = index.ask(
        f"SELECT night.name, night.filters, {column}.data FROM {column} "
        f"JOIN night ON night.id = {column}.night WHERE night.name >= ? AND night.name <= ? "
        f"AND length({column}.data) > 0 ORDER BY night.name",
        period.limits,
    )
    width = len(columns) * 8
    lengths = [len(data) // width for _, _, data in found]
    rows = table(b"".join(data for _, _, data in found), columns).copy()
    night = np.repeat(np.arange(len(found)), lengths)
    lists: dict[str, list[str]] = {text: json.loads(text) for text in {row[1] for row in found}}
    names = sorted({name for each in lists.values() for name in each})
    places = {text: np.array([names.index(n) for n in each]) for text, each in lists.items()}
    at = columns.index("filter")
    begin = 0
    for (_, text, _), length in zip(found, lengths, strict=True):
        part = rows[begin : begin + length, at]
        part[:] = places[text][part.astype(np.intp)]
        begin += length
    return rows, night, tuple(name for name, _, _ in found), tuple(names)


def measurements(index: PastIndex, period: Period = ALWAYS) -> Measurements:
    """Return every seeing value that stands in the logs of a period."""
    rows, night, nights, filters = tables_of(index, "seeing", SEEING_COLUMNS, period)
    mjd, zenith, local_h, filter_, airmass, measured = rows.T
    fits = (zenith > 0.0) & np.isfinite(zenith)
    return Measurements(
        mjd=mjd[fits],
        zenith_arcsec=zenith[fits],
        local_h=local_h[fits],
        airmass=airmass[fits],
        measured_arcsec=measured[fits],
        night=night[fits],
        filter=filter_[fits].astype(np.intp),
        nights=nights,
        filters=filters,
    )


def site_seeing(measured: Measurements) -> SiteSeeing:
    """Return the site's seeing from all measurements."""
    zenith = measured.zenith_arcsec
    months = np.array([int(name[5:7]) for name in measured.nights], dtype=np.intp)
    month = months[measured.night] if months.size else np.zeros(0, np.intp)
    # Noon first, so that the hours of a night stand in their order.
    known = ~np.isnan(measured.local_h)
    hour = np.full(zenith.size, -1)
    hour[known] = (measured.local_h[known].astype(np.intp) - 12) % 24
    slot = np.digitize(measured.airmass, AIRMASS_EDGES[1:-1])
    slot[np.isnan(measured.airmass)] = -1
    edges = np.arange(0.0, LAST_ARCSEC + BIN_ARCSEC / 2.0, BIN_ARCSEC)
    bins = np.minimum(zenith / BIN_ARCSEC, edges.size - 2).astype(np.intp)
    counts = np.bincount(bins, minlength=edges.size - 1)
    filters = [name or "no filter given" for name in measured.filters]
    return SiteSeeing(
        nights=len(np.unique(measured.night)),
        from_images=int(np.sum(measured.from_image)),
        all=_summary(zenith),
        by_month=_groups(zenith, month, ["", *MONTHS]),
        by_hour=_groups(zenith, hour, [f"{(at + 12) % 24:02d} h" for at in range(24)]),
        by_filter=_groups(zenith, measured.filter, filters),
        by_airmass=_groups(zenith, slot, airmass_labels()),
        edges_arcsec=tuple(float(edge) for edge in edges),
        counts=tuple(int(count) for count in counts),
    )


def airmass_labels() -> list[str]:
    """Return the names of the spans between the edges of airmass."""
    pairs = itertools.pairwise(AIRMASS_EDGES)
    return [
        f"{low:.1f} to {high:.1f}" if high < np.inf else f"over {low:.1f}" for low, high in pairs
    ]


def _groups(zenith: Floats, place: NDArray[np.intp], labels: Sequence[str]) -> tuple[Group, ...]:
    """Return the groups that have any value; a place of -1 is in none."""
    # Small integers are sorted by counting, so all groups together cost no more than one.
    small = place.astype(np.int16)
    ordered = zenith[np.argsort(small, kind="stable")]
    ends = np.cumsum(np.bincount(small + 1, minlength=len(labels) + 1))
    found = []
    for at, label in enumerate(labels):
        summary = _summary(ordered[ends[at] : ends[at + 1]])
        if summary is not None:
            found.append(Group(label, summary))
    return tuple(found)


def _summary(values: Floats) -> SeeingSummary | None:
    if values.size == 0:
        return None
    low, quarter, half, three_quarters, high = np.quantile(values, (0.0, 0.25, 0.5, 0.75, 1.0))
    return SeeingSummary(
        values.size, float(low), float(quarter), float(half), float(three_quarters), float(high)
    )
