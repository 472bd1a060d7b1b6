"""The night as the search sees it: one row a target, one a line of a plan, one column a minute.

Shapes: N targets, L lines of plans with something left, T minutes from now to the end of the
night. Minutes are counted from the grid's minute at or before now.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine.logbook import Target
from engine.night import Night, Outlook, Plans, TakenTonight, series_of
from engine.order.merit import finished_worth
from engine.order.order import Rules
from engine.order.repeats import Repeats, repeats_of
from engine.order.travel import Travel, travel_of
from engine.times import MINUTES_PER_DAY

Floats = NDArray[np.float64]
Counts = NDArray[np.int64]
Mask = NDArray[np.bool_]


@dataclass(frozen=True, slots=True)
class Line:
    """One line of a plan with something left to take; times in minutes but the exposure itself."""

    target: int
    filter: int
    seconds: float
    count: int
    change_min: float
    each_min: float

    @property
    def whole_min(self) -> float:
        """Minutes for all of it, with the filter's change and every readout."""
        return self.change_min + self.count * self.each_min


@dataclass(frozen=True, slots=True)
class Problem:
    """A night from one moment on, made ready for the search.

    ``start_min`` is now, in minutes after the first column. ``run_end`` (L, T): the last minute
    through which a line may be exposed from each on without a break, -1 where it may not.
    ``worth`` (L, T): priority x quality of a second, 0 where it may not. ``of_target`` (N, K)
    holds each target's lines, -1 for none. ``bonus`` (N,): what finishing a plan earns, 0 where
    it can't be finished. ``pointing`` is N when nobody has said where the telescope points.
    ``pins`` holds, by target, the minute at which its exposures are to begin, ``repeats`` what is
    left of those that are visited several times.
    """

    night: Night
    outlook: Outlook
    plans: Plans
    rules: Rules
    from_mjd: float
    first: int
    start_min: float
    minutes: int
    lines: tuple[Line, ...]
    of_target: Counts
    run_end: Counts
    worth: NDArray[np.float32]
    bonus: Floats
    contiguous_min: Floats
    travel: Travel
    pointing: int
    pins: dict[int, float]
    repeats: dict[int, Repeats]

    @property
    def targets(self) -> tuple[Target, ...]:
        """The night's targets."""
        return self.night.targets

    @property
    def readout_min(self) -> float:
        """Minutes to read one exposure out."""
        return self.night.observatory.camera.readout_s / 60.0

    def mjd_at(self, minute: float) -> float:
        """Return the moment (UTC MJD) a number of minutes after the first column."""
        return float(self.night.mjd[self.first]) + minute / MINUTES_PER_DAY

    def lines_of(self, target: int) -> list[int]:
        """Return the lines of one target, in the order of its plan."""
        own = self.of_target[target]
        found: list[int] = own[own >= 0].tolist()
        return found

    def asked_min(self, target: int) -> float:
        """Return the minutes all that is left of a target takes, without the way there."""
        return sum(self.lines[line].whole_min for line in self.lines_of(target))


def build_problem(
    night: Night,
    outlook: Outlook,
    plans: Plans,
    rules: Rules,
    *,
    from_mjd: float,
    pointing: str | None,
    travel: Travel | None = None,
    tonight: Sequence[TakenTonight] = (),
) -> Problem:
    """Return the rest of a night from a moment (UTC MJD) on, ready for the search.

    ``travel`` is the night's, if the caller keeps it: at 500 targets it is most of the work.
    ``tonight`` are the night's exposures that are kept: they bind the next visits of a series.
    """
    if rules.first is not None and all(each.name != rules.first for each in night.targets):
        # A target that has left the list can't come first.
        rules = replace(rules, first=None, hold=False)
    start_mjd = max(from_mjd, float(night.mjd[0]))
    # A hair of tolerance: an MJD is good to about a microsecond.
    first = int(np.searchsorted(night.mjd, start_mjd + 1e-9, side="right")) - 1
    lines = _lines(night, plans, rules)
    allowed = _allowed(night, outlook, rules, lines, first)
    # What lies behind the last minute of any use need not be searched.
    used = np.flatnonzero(allowed.any(axis=0))
    allowed = allowed[:, : (int(used[-1]) if used.size else 0) + 2]
    unbroken = allowed & ~_meridian_breaks(night, lines, first)[:, : allowed.shape[1]]
    of_target = _by_target(lines, len(night.targets))
    return Problem(
        night=night,
        outlook=outlook,
        plans=plans,
        rules=rules,
        from_mjd=from_mjd,
        first=first,
        start_min=max((start_mjd - float(night.mjd[first])) * MINUTES_PER_DAY, 0.0),
        minutes=allowed.shape[1],
        lines=lines,
        of_target=of_target,
        run_end=_run_ends(unbroken),
        worth=_worth(night, outlook, lines, allowed, first),
        bonus=_bonuses(night, plans, of_target, allowed),
        contiguous_min=np.array([each.contiguous_min or 0.0 for each in night.targets]),
        travel=(travel or travel_of(night)).since(first),
        pointing=len(night.targets) if pointing is None else night.target_index(pointing),
        pins={
            index: (rules.pinned[target.name] - float(night.mjd[first])) * MINUTES_PER_DAY
            for index, target in enumerate(night.targets)
            if target.name in rules.pinned
        },
        repeats=_repeats(night, plans, rules, of_target, first, tonight),
    )


def _lines(night: Night, plans: Plans, rules: Rules) -> tuple[Line, ...]:
    wheel, readout_s = night.observatory, night.observatory.camera.readout_s
    return tuple(
        Line(
            target=index,
            filter=place,
            seconds=each.seconds,
            count=each.remaining,
            change_min=wheel.filters[place].change_s / 60.0,
            each_min=(each.seconds + readout_s) / 60.0,
        )
        for index, target in enumerate(night.targets)
        if target.name not in rules.dropped
        for each in plans[target.name]
        if each.remaining and each.filter not in rules.forbidden_filters
        for place in (wheel.filter_index(each.filter),)
    )


def _allowed(
    night: Night, outlook: Outlook, rules: Rules, lines: tuple[Line, ...], first: int
) -> Mask:
    """Return the minutes (L, T) in which no limit forbids a line."""
    filters, targets = _columns(lines)
    at = slice(first, None)
    allowed = (
        (night.limits[targets, at] == 0)
        & night.dark[filters, at]
        & ~outlook.soft[filters, targets, at]
    )
    for place, line in enumerate(lines):
        name = night.targets[line.target].name
        until = rules.put_off.get(name)
        if until is not None:
            allowed[place] &= night.mjd[at] >= until
        pin_mjd = rules.pinned.get(name)
        if pin_mjd is not None:
            # Of the minute it falls into, the rest may be used: the exact times see to it.
            allowed[place] &= night.mjd[at] > pin_mjd - 1.0 / MINUTES_PER_DAY
    return np.asarray(allowed)


def _columns(lines: tuple[Line, ...]) -> tuple[Counts, Counts]:
    filters = np.array([line.filter for line in lines], dtype=np.int64)
    return filters, np.array([line.target for line in lines], dtype=np.int64)


def _worth(
    night: Night, outlook: Outlook, lines: tuple[Line, ...], allowed: Mask, first: int
) -> NDArray[np.float32]:
    filters, targets = _columns(lines)
    priorities = np.array([each.priority for each in night.targets], dtype=np.float32)
    until = first + allowed.shape[1]
    at = (filters, targets, slice(first, until))
    quality = outlook.quality[at]
    spread = [each.role == "standard" and each.visits > 1 for each in night.targets]
    # A standard is bright, and wanted low as well as high.
    quality[np.array(spread, dtype=bool)[targets]] = 1.0
    worth = quality * outlook.chance[at] * priorities[targets][:, None]
    return np.where(allowed, worth, np.float32(0.0))


def _meridian_breaks(night: Night, lines: tuple[Line, ...], first: int) -> Mask:
    """Return the minutes (L, T) in which a german mount has to turn over on a line's target."""
    breaks = np.zeros((len(night.targets), len(night.mjd) - first), dtype=bool)
    if night.observatory.telescope.mount == "german":
        angles = night.where.hour_angle_h[:, first:]
        # Only at the upper crossing; at the lower one the hour angle jumps from 12 to -12.
        breaks[:, 1:] = (angles[:, :-1] < 0.0) & (angles[:, 1:] >= 0.0) & (angles[:, 1:] < 6.0)
        # Below the pole it turns over as well: +12 h becomes -12 h.
        breaks[:, 1:] |= (angles[:, :-1] > 6.0) & (angles[:, 1:] < -6.0)
    found: Mask = breaks[_columns(lines)[1]]
    return found


def _run_ends(unbroken: Mask) -> Counts:
    """Return the last minute (L, T) of the unbroken stretch each minute is in; -1 outside."""
    minutes = unbroken.shape[1]
    broken_at = np.where(unbroken, minutes, np.arange(minutes))
    ahead = np.minimum.accumulate(broken_at[:, ::-1], axis=1)[:, ::-1]
    return np.where(unbroken, ahead - 1, -1).astype(np.int64)


def _by_target(lines: tuple[Line, ...], targets: int) -> Counts:
    rows: list[list[int]] = [[] for _ in range(targets)]
    for place, line in enumerate(lines):
        rows[line.target].append(place)
    width = max((len(row) for row in rows), default=0)
    table = np.full((targets, max(width, 1)), -1)
    for index, row in enumerate(rows):
        table[index, : len(row)] = row
    return table


def _bonuses(night: Night, plans: Plans, of_target: Counts, allowed: Mask) -> Floats:
    """Return what finishing each plan earns (N,); 0 where a line of it can't be taken at all."""
    possible: Mask = np.asarray(allowed.any(axis=1))
    bonus = np.zeros(len(night.targets))
    for index, target in enumerate(night.targets):
        own = of_target[index][of_target[index] >= 0]
        asked = sum(1 for line in plans[target.name] if line.remaining)
        if len(own) and len(own) == asked and possible[own].all():
            planned_s = sum(each.seconds * each.count for each in target.exposures)
            bonus[index] = finished_worth(target.priority, planned_s * target.visits)
    return bonus


def _repeats(
    night: Night,
    plans: Plans,
    rules: Rules,
    of_target: Counts,
    first: int,
    tonight: Sequence[TakenTonight],
) -> dict[int, Repeats]:
    """Return what is left of every target that is visited several times."""
    wheel, readout_s = night.observatory, night.observatory.camera.readout_s
    found: dict[int, Repeats] = {}
    for index, target in enumerate(night.targets):
        series = series_of(target, plans[target.name], tonight)
        if series is None or (own := of_target[index])[0] < 0:
            continue
        rest = iter([int(place) for place in own if place >= 0])
        wanted = tuple(
            next(rest) if each.remaining and each.filter not in rules.forbidden_filters else None
            for each in plans[target.name]
        )
        last_mjd = series.last_start_mjd
        begins_min = (
            -math.inf
            if last_mjd is None
            else (last_mjd - float(night.mjd[first])) * MINUTES_PER_DAY
        )
        # The whole night's range: which parts of it are sampled must not change with the hour.
        places = [wheel.filter_index(each.filter) for each in target.exposures]
        may = (night.limits[index] == 0) & night.dark[places].all(axis=0)
        each_min = tuple((each.seconds + readout_s) / 60.0 for each in target.exposures)
        found[index] = repeats_of(
            series, target, wanted, each_min, begins_min, night.airmass[index, may]
        )
    return found
