"""The night as the search sees it: one row a target, one a line of a plan, one column a minute.

Everything the search asks again and again - how long may I stay, what is a minute worth, how far
is it from there - is a table here, made once.

Shapes: N targets, L lines of plans with something left, T minutes from now to the end of the night.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.logbook import Target
from engine.night import Night, Outlook, Plans
from engine.order.order import Rules
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]
Counts = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Line:
    """One line of a plan with something left to take."""

    target: int
    filter: int
    seconds: float
    count: int
    change_s: float


@dataclass(frozen=True, slots=True)
class Problem:
    """A night from one moment on, made ready for the search.

    ``first`` is the place of its first minute in the night's grid. ``stay`` (L + 1, T): for how
    many minutes from each on a line may be exposed without a break. ``worth`` (L + 1, T): priority
    x quality of a second, 0 where it may not. ``left`` (N, T): minutes from each on in which a
    target may be observed at all. ``of_target`` (N, K) holds each target's lines, -1 for none: the
    row behind the last line, where nothing can be done, stands for it.
    """

    night: Night
    outlook: Outlook
    plans: Plans
    rules: Rules
    from_mjd: float
    first: int
    minutes: int
    lines: tuple[Line, ...]
    of_target: Counts
    remaining: Counts
    seconds: Floats
    change_min: Floats
    contiguous_min: Floats
    stay: Floats
    worth: Floats
    left: Floats
    pointing: int | None

    @property
    def each_min(self) -> Floats:
        """Minutes (L + 1,) that one exposure of a line takes, read out."""
        return (self.seconds + self.night.observatory.camera.readout_s) / 60.0

    @property
    def targets(self) -> tuple[Target, ...]:
        """The night's targets."""
        return self.night.targets

    def mjd_at(self, minute: float) -> float:
        """Return the moment (UTC MJD) a number of minutes after the first column."""
        return float(self.night.mjd[self.first]) + minute / MINUTES_PER_DAY

    def move_min(self, here: int | None, minute: int) -> Floats:
        """Return the minutes (N,) from a target (None: anywhere) to each, settled, at a minute."""
        telescope = self.night.observatory.telescope
        settle = telescope.settle_s / 60.0
        if here is None:
            return np.full(len(self.targets), settle + 90.0 / telescope.slew_deg_per_s / 60.0)
        at = min(self.first + minute, self.night.last)
        degrees = axis_travel_deg(self.night, here, at)
        times = degrees / telescope.slew_deg_per_s / 60.0 + settle
        times[here] = 0.0 if not self._needs_flip(here, at) else times[here]
        return times

    def _needs_flip(self, here: int, at: int) -> bool:
        """Say whether a german mount must turn over to go on with the target it is on."""
        hour_angles = self.night.where.hour_angle_h[here]
        before = hour_angles[max(at - 2, 0)]
        return (
            self.night.observatory.telescope.mount == "german"
            and before < 0.0 <= hour_angles[at]
            and hour_angles[at] < 6.0
        )


def axis_travel_deg(night: Night, here: int, at: int) -> Floats:
    """Return how far (deg, N) the slower axis turns from one target to each other.

    An altazimuth mount turns in azimuth and altitude; an equatorial one in hour angle and
    declination. A german mount that changes sides goes round by the pole.
    """
    where = night.where
    if night.observatory.telescope.mount == "altazimuth":
        turn = np.abs(where.azimuth_deg[:, at] - where.azimuth_deg[here, at])
        lift = np.abs(where.altitude_deg[:, at] - where.altitude_deg[here, at])
        return np.asarray(np.maximum(np.minimum(turn, 360.0 - turn), lift))
    angles, declinations = where.hour_angle_h[:, at] * 15.0, night.places.dec_deg
    turn = np.abs(angles - angles[here])
    lift = np.abs(declinations - declinations[here])
    if night.observatory.telescope.mount == "german":
        other_side = (angles < 0.0) != (angles[here] < 0.0)
        turn = np.where(other_side, np.abs(180.0 - turn), turn)
        by_pole = 180.0 - np.abs(declinations) - abs(declinations[here])
        lift = np.where(other_side, by_pole, lift)
    return np.asarray(np.maximum(turn, lift))


def build_problem(
    night: Night,
    outlook: Outlook,
    plans: Plans,
    rules: Rules,
    *,
    from_mjd: float,
    pointing: str | None,
) -> Problem:
    """Return the rest of a night from a moment (UTC MJD) on, ready for the search."""
    first = night.index_at(from_mjd)
    lines = _lines(night, plans, rules)
    allowed = _allowed(night, outlook, rules, lines, first)
    unbroken = allowed & ~_meridian_breaks(night, lines, first)
    worth = np.zeros((len(lines) + 1, allowed.shape[1]))
    for place, line in enumerate(lines):
        priority = night.targets[line.target].priority
        worth[place] = priority * outlook.quality[line.filter, line.target, first:] * allowed[place]
    any_line = np.zeros((len(night.targets), allowed.shape[1]), dtype=bool)
    for place, line in enumerate(lines):
        any_line[line.target] |= allowed[place]
    return Problem(
        night=night,
        outlook=outlook,
        plans=plans,
        rules=rules,
        from_mjd=from_mjd,
        first=first,
        minutes=allowed.shape[1],
        lines=lines,
        of_target=_by_target(lines, len(night.targets)),
        remaining=np.array([*(line.count for line in lines), 0], dtype=np.int64),
        seconds=np.array([*(line.seconds for line in lines), 1.0]),
        change_min=np.array([*(line.change_s for line in lines), 0.0]) / 60.0,
        contiguous_min=np.array([target.contiguous_min or 0.0 for target in night.targets]),
        stay=_minutes_without_break(unbroken),
        worth=worth,
        left=np.cumsum(any_line[:, ::-1], axis=1)[:, ::-1].astype(float),
        pointing=None if pointing is None else night.target_index(pointing),
    )


def _lines(night: Night, plans: Plans, rules: Rules) -> tuple[Line, ...]:
    wheel = night.observatory
    return tuple(
        Line(index, place, each.seconds, each.remaining, wheel.filters[place].change_s)
        for index, target in enumerate(night.targets)
        if target.name not in rules.dropped
        for each in plans[target.name]
        if each.remaining and each.filter not in rules.forbidden_filters
        for place in (wheel.filter_index(each.filter),)
    )


def _allowed(
    night: Night, outlook: Outlook, rules: Rules, lines: tuple[Line, ...], first: int
) -> NDArray[np.bool_]:
    mjd = night.mjd[first:]
    allowed = np.zeros((len(lines), len(mjd)), dtype=bool)
    for place, line in enumerate(lines):
        allowed[place] = (
            (night.limits[line.target, first:] == 0)
            & night.dark[line.filter, first:]
            & ~outlook.soft[line.filter, line.target, first:]
        )
        until = rules.put_off.get(night.targets[line.target].name)
        if until is not None:
            allowed[place] &= mjd >= until
    return allowed


def _meridian_breaks(night: Night, lines: tuple[Line, ...], first: int) -> NDArray[np.bool_]:
    """Return the minutes (L, T) in which a german mount has to turn over on a line's target."""
    breaks = np.zeros((len(lines), len(night.mjd) - first), dtype=bool)
    if night.observatory.telescope.mount != "german":
        return breaks
    hour_angles = night.where.hour_angle_h[:, first:]
    crossing = np.zeros(hour_angles.shape, dtype=bool)
    crossing[:, :-1] = (hour_angles[:, :-1] < 0.0) & (hour_angles[:, 1:] >= 0.0)
    crossing &= np.abs(hour_angles) < 6.0
    for place, line in enumerate(lines):
        breaks[place] = crossing[line.target]
    return breaks


def _minutes_without_break(unbroken: NDArray[np.bool_]) -> Floats:
    """Return for how many minutes from each on a line may be exposed, with a last row of none."""
    stay = np.zeros((unbroken.shape[0] + 1, unbroken.shape[1]))
    ahead = np.zeros(unbroken.shape[0])
    for minute in range(unbroken.shape[1] - 1, -1, -1):
        ahead = np.where(unbroken[:, minute], ahead + 1.0, 0.0)
        stay[:-1, minute] = ahead
    return stay


def _by_target(lines: tuple[Line, ...], targets: int) -> Counts:
    rows: list[list[int]] = [[] for _ in range(targets)]
    for place, line in enumerate(lines):
        rows[line.target].append(place)
    width = max((len(row) for row in rows), default=0)
    table = np.full((targets, max(width, 1)), -1)
    for index, row in enumerate(rows):
        table[index, : len(row)] = row
    return table
