"""Every target at one moment: what the live list, the card and `warmroom sky` show."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass

from engine.logbook import Target
from engine.night.outlook import Outlook
from engine.night.progress import Plans, Progress, is_finished
from engine.night.reasons import Reason, bit_of, reasons_in
from engine.night.tables import Night


@dataclass(frozen=True, slots=True)
class FilterNow:
    """One filter of a target's plan at one moment. Sizes in arcsec, NaN below the horizon."""

    progress: Progress
    filter_index: int
    image_size_arcsec: float
    sky_mag_arcsec2: float
    soft: bool


@dataclass(frozen=True, slots=True)
class TargetNow:
    """One target at one moment: where it is, and every reason it may not be observed."""

    target: Target
    index: int
    altitude_deg: float
    apparent_altitude_deg: float
    azimuth_deg: float
    hour_angle_h: float
    parallactic_angle_deg: float
    airmass: float
    moon_separation_deg: float
    filters: tuple[FilterNow, ...]
    reasons: tuple[Reason, ...]

    @property
    def observable(self) -> bool:
        """Whether it may be observed now, in at least one filter it still needs."""
        return not self.reasons

    @property
    def worst_image_size_arcsec(self) -> float:
        """The largest image among the filters still needed (all of them when none is)."""
        needed = [each for each in self.filters if each.progress.remaining] or self.filters
        return max(each.image_size_arcsec for each in needed)


def targets_at(
    night: Night,
    outlook: Outlook,
    mjd: float,
    plans: Plans,
    decided: Mapping[str, str] | None = None,
) -> tuple[TargetNow, ...]:
    """Return every target of the night at the minute nearest to a moment (UTC MJD).

    ``decided`` holds, by target, the code of a reason that the observer made: dropped, put off.
    """
    at = night.index_at(mjd)
    codes = decided or {}
    return tuple(
        _target_at(night, outlook, index, at, plans[target.name], codes.get(target.name))
        for index, target in enumerate(night.targets)
    )


def _target_at(
    night: Night,
    outlook: Outlook,
    index: int,
    at: int,
    plan: tuple[Progress, ...],
    decided: str | None,
) -> TargetNow:
    where = night.where
    filters = tuple(_filter_at(night, outlook, index, at, line) for line in plan)
    bits = int(night.limits[index, at]) | (bit_of(decided) if decided else 0)
    if is_finished(plan):
        bits |= bit_of("finished")
    needed = [each for each in filters if each.progress.remaining]
    if needed and math.isfinite(night.airmass[index, at]) and all(each.soft for each in needed):
        bits |= bit_of("too_soft")
    return TargetNow(
        target=night.targets[index],
        index=index,
        altitude_deg=float(where.altitude_deg[index, at]),
        apparent_altitude_deg=float(night.apparent_altitude_deg[index, at]),
        azimuth_deg=float(where.azimuth_deg[index, at]),
        hour_angle_h=float(where.hour_angle_h[index, at]),
        parallactic_angle_deg=float(where.parallactic_angle_deg[index, at]),
        airmass=float(night.airmass[index, at]),
        moon_separation_deg=float(night.moon_separation_deg[index, at]),
        filters=filters,
        reasons=reasons_in(bits),
    )


def _filter_at(night: Night, outlook: Outlook, index: int, at: int, line: Progress) -> FilterNow:
    place = night.observatory.filter_index(line.filter)
    return FilterNow(
        progress=line,
        filter_index=place,
        image_size_arcsec=float(outlook.image_size_arcsec[place, index, at]),
        sky_mag_arcsec2=float(night.sky_mag_arcsec2[place, index, at]),
        soft=bool(outlook.soft[place, index, at]),
    )
