"""Is an order lawful? Worked out from astropy's positions, sharing no code with the search.

Every exposure is looked at when it begins, at its middle and when it ends. What depends on the
seeing (image size) is read from the outlook at the minutes around; everything else is worked out
again from the logbook.
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import astropy.units as u
import numpy as np
from astropy.coordinates import AltAz, EarthLocation, SkyCoord, get_body
from astropy.time import Time

from engine.logbook import Observatory, Target
from engine.night import Night, Outlook, Plans
from engine.order import Order, Rules, Visit
from engine.positions import prepare_astropy

# Positions of ours and astropy's agree to an arcsecond or so; the Moon's centre to less than 20.
# Refraction near the limits is the engine's own model, as altitudes are judged as seen.
ALTITUDE_DEG, HOUR_ANGLE_H, MOON_DEG, AIRMASS = 0.02, 0.002, 0.05, 0.01
SECOND_DAYS = 1.0 / 86400.0


@dataclass(frozen=True)
class Moment:
    """One moment of one exposure."""

    target: Target
    filter: str
    mjd: float


def faults(order: Order, night: Night, outlook: Outlook, plans: Plans, rules: Rules) -> list[str]:
    """Return everything that is unlawful about an order; empty when nothing is."""
    prepare_astropy()
    return [
        *_counts(order, plans, rules),
        *_repeats(order, night, rules),
        *_overlaps(order, night),
        *_breaks(order, night),
        *_limits(order, night, rules),
        *_soft(order, night, outlook),
    ]


def _counts(order: Order, plans: Plans, rules: Rules) -> list[str]:
    found = []
    taken: dict[tuple[str, str, float], int] = {}
    for visit in order.visits:
        if visit.target in rules.dropped:
            found.append(f"{visit.target} was dropped")
        for run in visit.exposures:
            key = (visit.target, run.filter, run.seconds)
            taken[key] = taken.get(key, 0) + run.count
            if run.filter in rules.forbidden_filters:
                found.append(f"{run.filter} is forbidden")
            if run.count < 1:
                found.append(f"{visit.target}: a run of {run.count} exposures")
    for (target, filter_, seconds), count in taken.items():
        asked = sum(
            line.remaining
            for line in plans[target]
            if line.filter == filter_ and line.seconds == seconds
        )
        if count > asked:
            found.append(f"{target} {filter_}: {count} exposures of {asked} asked for")
    return found


def _runs(order: Order, observatory: Observatory) -> list[tuple[Visit, str, float, float]]:
    """Return (visit, filter, begin, end with the last readout) of every run, in days."""
    readout_s = observatory.camera.readout_s
    return [
        (visit, r.filter, r.start_mjd, r.start_mjd + r.count * (r.seconds + readout_s) / 86400.0)
        for visit in order.visits
        for r in visit.exposures
    ]


def _repeats(order: Order, night: Night, rules: Rules) -> list[str]:
    """Return visits of a series that are not whole, or too near or too far from the one before."""
    found = []
    for target in night.targets:
        if target.visits == 1:
            continue
        whole = sum(
            each.count for each in target.exposures if each.filter not in rules.forbidden_filters
        )
        own = [visit for visit in order.visits if visit.target == target.name]
        counts = [sum(run.count for run in visit.exposures) for visit in own]
        found += [f"{target.name}: {n} exposures of {whole}" for n in counts if n != whole]
        for one, other in pairwise(own):
            gap = (other.exposures[0].start_mjd - one.exposures[0].start_mjd) * 1440.0
            if gap < (target.least_gap_min or 0.0) - 0.02:
                found.append(f"{target.name}: visits {gap:.1f} min apart, too near")
            if target.greatest_gap_min and gap > target.greatest_gap_min + 0.02:
                found.append(f"{target.name}: visits {gap:.1f} min apart, too far")
    return found


def _overlaps(order: Order, night: Night) -> list[str]:
    """Find runs that begin before the mount, the wheel and the camera can be ready."""
    observatory = night.observatory
    telescope = observatory.telescope
    runs = _runs(order, observatory)
    found = []
    for (left, right), way_deg in zip(pairwise(runs), _ways_deg(night, runs), strict=True):
        need_s = observatory.filter_named(right[1]).change_s
        if way_deg > 0.0:
            need_s += way_deg / telescope.slew_deg_per_s + telescope.settle_s
        if right[2] + 1.0 * SECOND_DAYS < left[3] + need_s * SECOND_DAYS:
            short_s = (left[3] - right[2]) / SECOND_DAYS + need_s
            found.append(f"{left[0].target} to {right[0].target}: {short_s:.1f} s too early")
    if runs and runs[0][2] < order.from_mjd - SECOND_DAYS:
        found.append("the first exposure begins before the order does")
    found += [f"{v.target} begins after its exposures" for v in order.visits if _early(v)]
    return found


def _early(visit: Visit) -> bool:
    return visit.start_mjd > visit.exposures[0].start_mjd + SECOND_DAYS


def _target(night: Night, name: str) -> Target:
    return next(target for target in night.targets if target.name == name)


def _frame(observatory: Observatory, mjd: Any) -> AltAz:
    site = observatory.site
    place = EarthLocation.from_geodetic(
        site.longitude_deg * u.deg, site.latitude_deg * u.deg, site.elevation_m * u.m
    )
    return AltAz(obstime=Time(mjd, format="mjd", scale="utc"), location=place)


def _coordinates(targets: list[Target]) -> SkyCoord:
    return SkyCoord([t.ra_deg for t in targets] * u.deg, [t.dec_deg for t in targets] * u.deg)


def _hour_angle_h(altitude: Any, azimuth: Any, latitude_deg: float) -> tuple[Any, Any]:
    """Return hour angle (h, -12 to 12) and declination (deg) from the horizon's angles."""
    alt, az, lat = np.radians(altitude), np.radians(azimuth), np.radians(latitude_deg)
    sin_dec = np.sin(alt) * np.sin(lat) + np.cos(alt) * np.cos(lat) * np.cos(az)
    west = -np.sin(az) * np.cos(alt)
    south = np.sin(alt) * np.cos(lat) - np.cos(alt) * np.sin(lat) * np.cos(az)
    return np.degrees(np.arctan2(west, south)) / 15.0, np.degrees(np.arcsin(sin_dec))


def _ways_deg(night: Night, runs: list[tuple[Visit, str, float, float]]) -> list[float]:
    """Return how far the slower axis turns between each run and the next, in degrees."""
    if len(runs) < 2:
        return []
    observatory = night.observatory
    # Of every pair: the left where it is left, the right at the same moment and where it begins.
    names = [n for a, b in pairwise(runs) for n in (a[0].target, b[0].target, b[0].target)]
    moments = np.array([t for a, b in pairwise(runs) for t in (a[3], a[3], b[2])])
    seen = _coordinates([_target(night, name) for name in names]).transform_to(
        _frame(observatory, moments)
    )
    altitude, azimuth = seen.alt.deg, seen.az.deg
    angle_h, declination = _hour_angle_h(altitude, azimuth, observatory.site.latitude_deg)
    columns = (altitude, azimuth, angle_h, declination)
    return [
        _way_deg(observatory, names[i] == names[i + 1], *(c[i : i + 3] for c in columns))
        for i in range(0, len(names), 3)
    ]


def _way_deg(
    observatory: Observatory, same: bool, altitude: Any, azimuth: Any, angle_h: Any, dec: Any
) -> float:
    """Return how far the slower axis turns; angles of left, right at once, right at its begin."""
    mount = observatory.telescope.mount
    across = mount == "german" and (angle_h[0] < 0.0) != (angle_h[2] < 0.0)
    if same and not across:
        return 0.0
    if mount == "altazimuth":
        turn, lift = abs(azimuth[0] - azimuth[1]), abs(altitude[0] - altitude[1])
    else:
        turn, lift = abs(angle_h[0] - angle_h[1]) * 15.0, abs(dec[0] - dec[1])
    turn = min(turn, 360.0 - turn)
    if across:
        turn, lift = abs(180.0 - turn), 180.0 - abs(dec[0]) - abs(dec[1])
    # A hair less: these angles hold aberration and refraction differently from the mount's.
    return float(max(max(turn, lift) - 0.02, 0.0))


def _breaks(order: Order, night: Night) -> list[str]:
    """Find visits shorter than their targets want to be stayed on, unless all that's left is."""
    found = []
    readout_s = night.observatory.camera.readout_s
    for visit in order.visits:
        target = _target(night, visit.target)
        if target.contiguous_min is None:
            continue
        own = [v for v in order.visits if v.target == visit.target]
        asked_min = sum(e.count * (e.seconds + readout_s) for e in target.exposures) / 60.0
        lasts_min = (visit.end_mjd - visit.exposures[0].start_mjd) * 1440.0
        least = min(target.contiguous_min, asked_min)
        # The last visit of a plan may be as short as what is left.
        if lasts_min < least - 0.05 and visit is not own[-1]:
            found.append(f"{visit.target}: left after {lasts_min:.1f} min of {least:.1f}")
    return found


def _moments(order: Order, night: Night) -> list[Moment]:
    readout_s = night.observatory.camera.readout_s
    moments = []
    for visit in order.visits:
        target = _target(night, visit.target)
        for run in visit.exposures:
            for number in range(run.count):
                begin_s = number * (run.seconds + readout_s)
                for share in (0.0, 0.5, 1.0):
                    at = run.start_mjd + (begin_s + share * run.seconds) * SECOND_DAYS
                    moments.append(Moment(target, run.filter, at))
    return moments


def _limits(order: Order, night: Night, rules: Rules) -> list[str]:
    """Find moments of exposures at which a limit is broken."""
    moments = _moments(order, night)
    if not moments:
        return []
    observatory = night.observatory
    mjd = np.array([moment.mjd for moment in moments])
    frame = _frame(observatory, mjd)
    stars = _coordinates([moment.target for moment in moments])
    seen = stars.transform_to(frame)
    # Refraction: the engine's, read off its tables where they are nearest.
    places = np.clip(np.searchsorted(night.mjd, mjd), 0, len(night.mjd) - 1)
    rows = np.array([night.target_index(moment.target.name) for moment in moments])
    lifted = night.apparent_altitude_deg[rows, places] - night.where.altitude_deg[rows, places]
    altitude = seen.alt.deg + lifted
    angles, _ = _hour_angle_h(seen.alt.deg, seen.az.deg, observatory.site.latitude_deg)
    sun = get_body("sun", frame.obstime, frame.location).transform_to(frame)
    moon = get_body("moon", frame.obstime, frame.location)
    moon_up = moon.transform_to(frame).alt.deg > 0.05
    apart = stars.transform_to(moon.frame).separation(moon).deg
    skyline = _skyline(observatory, seen.az.deg)
    telescope = observatory.telescope
    low_h, high_h = telescope.hour_angle_limits_h
    wheel = {each.name: each for each in observatory.filters}
    darkest = np.array([wheel[m.filter].maximum_sun_altitude_deg for m in moments])
    least_moon = np.array([m.target.minimum_moon_separation_deg or 0.0 for m in moments])
    most_mass = np.array([m.target.maximum_airmass or np.inf for m in moments])
    # Pickering (2002): the air mass that the logbook's limits are meant in.
    up = np.maximum(altitude, 0.1)
    mass = 1.0 / np.sin(np.radians(up + 244.0 / (165.0 + 47.0 * up**1.1)))
    wrong = {
        "too low": altitude < telescope.minimum_altitude_deg - ALTITUDE_DEG,
        "behind the skyline": altitude < skyline - ALTITUDE_DEG,
        "too high": altitude > telescope.maximum_altitude_deg + ALTITUDE_DEG,
        "hour angle": (angles < low_h - HOUR_ANGLE_H) | (angles > high_h + HOUR_ANGLE_H),
        "too light": sun.alt.deg > darkest + ALTITUDE_DEG,
        "near the Moon": moon_up & (apart < least_moon - MOON_DEG),
        "airmass": mass > most_mass + AIRMASS,
        "window": ~np.array([_in_window(m) for m in moments]),
        "put off": mjd
        < np.array([rules.put_off.get(m.target.name, -np.inf) for m in moments]) - SECOND_DAYS,
    }
    return [
        f"{moments[at].target.name} {what} at {moments[at].mjd:.5f}"
        for what, mask in wrong.items()
        for at in np.flatnonzero(mask)[:3]
    ]


def _skyline(observatory: Observatory, azimuth_deg: Any) -> Any:
    if not observatory.site.horizon:
        return np.zeros_like(azimuth_deg)
    azimuths, altitudes = np.array(observatory.site.horizon).T
    return np.interp(azimuth_deg, azimuths, altitudes, period=360.0)


def _in_window(moment: Moment) -> bool:
    windows = moment.target.windows_mjd
    hair = SECOND_DAYS
    return not windows or any(b - hair <= moment.mjd <= e + hair for b, e in windows)


def _soft(order: Order, night: Night, outlook: Outlook) -> list[str]:
    """Find exposures whose images are larger than their target's limit by the outlook."""
    found = []
    for moment in _moments(order, night):
        limit = moment.target.maximum_image_size_arcsec
        if limit is None:
            continue
        row = night.target_index(moment.target.name)
        place = night.observatory.filter_index(moment.filter)
        size = np.interp(moment.mjd, night.mjd, outlook.image_size_arcsec[place, row])
        if size > limit * 1.001:
            found.append(f"{moment.target.name} {size:.2f} arcsec of {limit:.2f}")
    return found
