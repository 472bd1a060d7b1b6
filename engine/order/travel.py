"""How long the telescope takes from one target to the next.

The slower axis decides, then it settles. An equatorial mount turns in hour angle and declination,
and since all targets move together that never changes in a night, but for a german mount, which
reaches the other side of the meridian round by the pole. An altazimuth mount turns in azimuth and
altitude, so the times change slowly through the night.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine.night import Night

Singles = NDArray[np.float32]
Places = NDArray[np.int64]

# The way to the first target when nobody has said where the telescope points: a quarter turn.
FROM_ANYWHERE_DEG = 90.0
# Entries an altazimuth mount's tables may have together: 24 MB, built in under 0.1 s.
TABLE_ENTRIES = 6_000_000
# Apart from this an altazimuth mount's tables need not be made more often.
STEP_MIN = 20


@dataclass(frozen=True, slots=True)
class Travel:
    """Travel times in minutes, settled, between N targets and from nowhere in particular (row N).

    Made once a night; ``since`` counts its minutes from a later place in the night's grid,
    ``first``.

    ``tables`` (S, N+1, N+1) is read at a place that depends on the mount: german, 0 on the same
    side of the meridian and 1 across it, by ``west`` (N+1, T); altazimuth, the stretch of
    ``step_min`` minutes of the whole night; fork, always 0. The search reads the tables; an
    order's times are made with `exact_min`.
    """

    night: Night
    first: int
    tables: Singles
    west: NDArray[np.int64]
    step_min: int

    def since(self, first: int) -> Travel:
        """Return the same times with minutes counted from a place in the night's grid."""
        return replace(self, first=first, west=self.west[:, first - self.first :])

    def stretch(self, minute: int) -> int:
        """Return the place of an altazimuth mount's table for a minute."""
        return min((self.first + minute) // self.step_min, len(self.tables) - 1)

    def between(self, here: Places, there: Places, minute: Places) -> Singles:
        """Return the minutes from targets to targets at minutes; arrays broadcast."""
        if self.step_min:
            stretch = (self.first + minute) // self.step_min
            which = np.minimum(stretch, len(self.tables) - 1)
        else:
            which = self.west[here, minute] ^ self.west[there, minute]
        found: Singles = self.tables[which, here, there]
        return found

    def exact_min(self, here: int, leave_min: float, there: int, start_min: float) -> float:
        """Return the minutes it takes to leave one target and start on another, each when said.

        A mount that stays where it is needs none; one that must turn over on its target does.
        """
        telescope = self.night.observatory.telescope
        settle_min = telescope.settle_s / 60.0
        if here == len(self.night.targets):
            return settle_min + FROM_ANYWHERE_DEG / telescope.slew_deg_per_s / 60.0
        leave, start = (
            min(max(self.first + int(minute), 0), self.night.last)
            for minute in (leave_min, start_min)
        )
        if telescope.mount != "altazimuth":
            across = self.west[here, leave - self.first] != self.west[there, start - self.first]
            return float(self.tables[int(across), here, there])
        if here == there:
            return 0.0
        where = self.night.where
        ways_deg = []
        for at in (leave, min(leave + 1, self.night.last), start):
            turn = abs(where.azimuth_deg[here, at] - where.azimuth_deg[there, at])
            lift = abs(where.altitude_deg[here, at] - where.altitude_deg[there, at])
            ways_deg.append(max(min(turn, 360.0 - turn), lift))
        return float(max(ways_deg) / telescope.slew_deg_per_s / 60.0 + settle_min)


def travel_of(night: Night) -> Travel:
    """Return the travel times of a whole night."""
    mount = night.observatory.telescope.mount
    minutes, targets = len(night.mjd), len(night.targets)
    west = np.zeros((targets + 1, minutes), dtype=np.int64)
    step_min = 0
    if mount == "altazimuth":
        most = max(TABLE_ENTRIES // (targets + 1) ** 2, 1)
        step_min = max(STEP_MIN, -(-minutes // most))
        ways_deg = [_altazimuth_deg(night, at) for at in range(0, minutes, step_min)]
    else:
        ways_deg = _equatorial_deg(night)
        if mount == "german":
            west[:-1] = night.where.hour_angle_h >= 0.0
        else:
            # A fork never turns over, so the sides never differ.
            ways_deg = ways_deg[:1]
    return Travel(night, 0, _as_minutes(night, np.array(ways_deg)), west, step_min)


def _as_minutes(night: Night, ways_deg: NDArray[np.float64]) -> Singles:
    """Return the times (S, N+1, N+1) for ways (S, N, N) in degrees."""
    telescope = night.observatory.telescope
    stretches, targets = ways_deg.shape[:2]
    per_min = telescope.slew_deg_per_s * 60.0
    tables = np.full(
        (stretches, targets + 1, targets + 1),
        telescope.settle_s / 60.0 + FROM_ANYWHERE_DEG / per_min,
        dtype=np.float32,
    )
    tables[:, :targets, :targets] = ways_deg / per_min + telescope.settle_s / 60.0
    staying = np.arange(targets)
    # Going on with the target it is on costs nothing, unless a german mount turns over for it.
    for stretch in range(stretches):
        if not (telescope.mount == "german" and stretch == 1):
            tables[stretch, staying, staying] = 0.0
    return tables


def _equatorial_deg(night: Night) -> list[NDArray[np.float64]]:
    """Return how far (deg, N x N) the slower axis turns on one side of the meridian and across."""
    angles = night.where.hour_angle_h[:, 0] * 15.0
    declinations = night.places.dec_deg
    turn = np.abs(angles[:, None] - angles[None, :])
    turn = np.minimum(turn, 360.0 - turn)
    lift = np.abs(declinations[:, None] - declinations[None, :])
    by_pole = 180.0 - np.abs(declinations)[:, None] - np.abs(declinations)[None, :]
    return [np.maximum(turn, lift), np.maximum(np.abs(180.0 - turn), by_pole)]


def _altazimuth_deg(night: Night, at: int) -> NDArray[np.float64]:
    """Return how far (deg, N x N) the slower axis turns at one place in the grid."""
    azimuths, altitudes = night.where.azimuth_deg[:, at], night.where.altitude_deg[:, at]
    turn = np.abs(azimuths[:, None] - azimuths[None, :])
    turn = np.minimum(turn, 360.0 - turn)
    return np.maximum(turn, np.abs(altitudes[:, None] - altitudes[None, :]))
