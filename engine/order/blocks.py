"""Blocks: pieces of plans that are placed whole, and what each is worth by when it begins.

The search counts time in ticks of half a minute. Rounding a visit and the way to the next to ticks
together errs by seven seconds either way; the order itself is timed exactly afterwards.

Shapes: B blocks, K ticks from now to the end of the night, and one column past the end.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from engine.order.pins import pin_worths
from engine.order.problem import Problem
from engine.order.repeats import SAMPLED_SHARE, Part

Singles = NDArray[np.float32]
Places = NDArray[np.int64]

TICKS_PER_MIN = 2
# A plan longer than the first is cut into pieces of about the second, so that it can be fitted in.
WHOLE_MIN, PIECE_MIN = 60.0, 40.0
# How often a block that fits nowhere is halved before what is left of it is left to the filling.
HALVINGS = 4
# The value of beginning where a block may not: worse than anything it could win.
NEVER = np.float32(-1e9)

# What never and long ago are in ticks, and how far apart visits stay from their greatest gap.
FAR, FAR_BACK, SLIP = 10**6, -(10**7), 2


@dataclass(frozen=True, slots=True)
class Blocks:
    """Every block: its target, parts and minutes, and its value (B, K+1) by the tick it begins.

    ``value`` is `NEVER` where a limit forbids it; what a pin counts is in it for targets that are
    ``pinned`` (B,). Visits of a series (`engine.order.repeats`) are blocks of their own: ``series``
    (B,) is their target, -1 for other blocks, ``least`` and ``greatest`` (B,) the ticks from the
    begin of the last of them to this one, ``last`` when that was, by target. Visits of a standard
    have an airmass of their own, ``own_part`` (B,), at which they count in full: ``parts_at`` says
    which part of its range a target is in at each tick, ``sampled`` which are done.
    ``ready`` (B, K+1) is the next tick at which no limit forbids, K for never
    again. What finishing a plan earns is in the value when the plan is one block; ``pieces`` (N,)
    counts the blocks of the other plans that can be finished,
    0 for the rest, and ``bonus`` (N,) is what all of them together earn.
    """

    target: Places
    parts: tuple[tuple[Part, ...], ...]
    minutes: Singles
    value: Singles
    ready: Places
    pieces: Places
    bonus: Singles
    pinned: NDArray[np.bool_]
    series: Places
    least: Places
    greatest: Places
    last: dict[int, int]
    own_part: Places
    parts_at: dict[int, Places]
    sampled: dict[int, frozenset[int]]

    def finishing(self, order: list[int]) -> float:
        """Return what the plans of several blocks earn that are all in an order."""
        placed = np.bincount(self.target[order], minlength=len(self.pieces))
        return float(self.bonus[(placed == self.pieces) & (self.pieces > 0)].sum())

    @property
    def ticks(self) -> int:
        """How many ticks there are; the last column stands for the end of the night."""
        return int(self.value.shape[1]) - 1


def cut(problem: Problem) -> Blocks:
    """Return the plans cut into blocks; those that fit nowhere are cut finer, then left out."""
    waiting = [
        (target, piece)
        for target in range(len(problem.targets))
        for piece in _pieces(problem, target)
    ]
    longest_min = max((_length_min(problem, parts) for _, parts in waiting), default=0.0)
    lines = _LineTicks.of(problem, longest_min)
    kept: list[tuple[int, tuple[Part, ...]]] = []
    values: list[Singles] = []
    parts_at = _airmass_parts(problem)
    own_parts: list[int] = []
    for _ in range(HALVINGS):
        table = _values(problem, waiting, lines)
        own = _own_parts(problem, waiting)
        _sample_airmass(waiting, own, parts_at, table)
        fits = np.asarray((table > NEVER).any(axis=1))
        kept += [each for each, fit in zip(waiting, fits, strict=True) if fit]
        own_parts += [each for each, fit in zip(own, fits, strict=True) if fit]
        values.append(table[fits])
        waiting = [
            (target, less)
            for (target, parts), fit in zip(waiting, fits, strict=True)
            if not fit
            for less in _halves(problem, target, parts)
        ]
        if not waiting:
            break
    lengths = [_length_min(problem, parts) for _, parts in kept]
    target = np.array([target for target, _ in kept], dtype=np.int64)
    value = np.concatenate(values) if values else np.zeros((0, _ticks(problem) + 1), np.float32)
    return Blocks(
        target=target,
        parts=tuple(parts for _, parts in kept),
        minutes=np.array(lengths, dtype=np.float32),
        value=value,
        ready=_ready(value),
        pieces=_pieces_to_finish(problem, kept),
        bonus=problem.bonus.astype(np.float32),
        pinned=np.array([target in problem.pins for target, _ in kept], dtype=bool),
        **_gaps(problem, kept),
        own_part=np.array(own_parts, dtype=np.int64),
        parts_at=parts_at,
        sampled={
            target: each.spread.sampled
            for target, each in problem.repeats.items()
            if each.spread is not None
        },
    )


def _gaps(problem: Problem, kept: list[tuple[int, tuple[Part, ...]]]) -> dict[str, Any]:
    """Return what binds visits of a series to each other, in ticks."""
    series = np.full(len(kept), -1, dtype=np.int64)
    least, greatest = np.zeros(len(kept), dtype=np.int64), np.full(len(kept), FAR)
    for row, (target, parts) in enumerate(kept):
        repeats = problem.repeats.get(target)
        # What remains of a visit that was begun is bound to nothing.
        if repeats is None or (repeats.begun and parts == repeats.visits[0]):
            continue
        series[row] = target
        least[row] = math.ceil(repeats.least_min * TICKS_PER_MIN)
        if repeats.greatest_min < math.inf:
            # A little less: the exact times may slip by seconds, and later is not lawful.
            greatest[row] = max(int(repeats.greatest_min * TICKS_PER_MIN) - SLIP, least[row])
    last = dict.fromkeys(problem.repeats, FAR_BACK)
    for target, each in problem.repeats.items():
        if each.last_min > -math.inf and each.visits:
            # A block begins with the filter's change, a visit with its first exposure.
            change_min = problem.lines[each.visits[-1][0][0]].change_min
            last[target] = math.floor((each.last_min - change_min) * TICKS_PER_MIN)
    return {"series": series, "least": least, "greatest": greatest, "last": last}


def _ready(value: Singles) -> Places:
    """Return the next tick (B, K+1) at which each block may begin."""
    ticks = value.shape[1] - 1
    possible = np.where(value > NEVER, np.arange(ticks + 1), ticks)
    return np.minimum.accumulate(possible[:, ::-1], axis=1)[:, ::-1].astype(np.int64)


def _pieces_to_finish(problem: Problem, kept: list[tuple[int, tuple[Part, ...]]]) -> Places:
    """Return how many blocks finish each plan (N,); 0 for one, and where blocks don't suffice."""
    pieces = np.zeros(len(problem.targets), dtype=np.int64)
    left = {target: sum(c for _, c in parts) for target, parts in _whole_plans(problem)}
    for target, parts in kept:
        pieces[target] += 1
        left[target] -= sum(count for _, count in parts)
    short = [target for target, count in left.items() if count > 0]
    pieces[short] = 0
    pieces[pieces == 1] = 0
    return pieces


def _whole_plans(problem: Problem) -> list[tuple[int, tuple[Part, ...]]]:
    return [
        (target, tuple((line, problem.lines[line].count) for line in problem.lines_of(target)))
        for target in range(len(problem.targets))
    ]


def _ticks(problem: Problem) -> int:
    return problem.minutes * TICKS_PER_MIN


def _length_min(problem: Problem, parts: tuple[Part, ...]) -> float:
    lines = problem.lines
    return sum(lines[line].change_min + count * lines[line].each_min for line, count in parts)


def _pieces(problem: Problem, target: int) -> list[tuple[Part, ...]]:
    """Return what is left of one target's plan in pieces: whole when it is short enough."""
    own = problem.lines_of(target)
    asked_min, unbroken_min = problem.asked_min(target), problem.contiguous_min[target]
    parts = tuple((line, problem.lines[line].count) for line in own)
    if not parts:
        return []
    if target in problem.repeats:
        return list(problem.repeats[target].visits)
    # A run that must not be broken is cut only where each piece is still long enough.
    if asked_min <= max(WHOLE_MIN, 2.0 * unbroken_min):
        return [parts]
    share_min = asked_min / max(int(asked_min // max(PIECE_MIN, 1.2 * unbroken_min)), 1)
    return _cut_at(problem, parts, share_min, unbroken_min)


def _cut_at(
    problem: Problem, parts: tuple[Part, ...], share_min: float, least_min: float
) -> list[tuple[Part, ...]]:
    """Return parts in pieces of about a share (minutes) each, none shorter than the least."""
    pieces: list[list[Part]] = [[]]
    filled_min = 0.0
    for line, count in parts:
        each_min, left = problem.lines[line].each_min, count
        while left:
            take = min(left, max(1, round((share_min - filled_min) / each_min)))
            pieces[-1].append((line, take))
            filled_min += take * each_min
            left -= take
            if filled_min >= 0.9 * share_min:
                pieces.append([])
                filled_min = 0.0
    found = [tuple(piece) for piece in pieces if piece]
    if len(found) > 1 and _length_min(problem, found[-1]) < max(least_min, 0.3 * share_min):
        last = found.pop()
        found[-1] = _joined(found[-1], last)
    return found


def _joined(first: tuple[Part, ...], then: tuple[Part, ...]) -> tuple[Part, ...]:
    if first[-1][0] == then[0][0]:
        line, count = then[0]
        return (*first[:-1], (line, first[-1][1] + count), *then[1:])
    return (*first, *then)


def _halves(problem: Problem, target: int, parts: tuple[Part, ...]) -> list[tuple[Part, ...]]:
    """Return parts in two: between filters, or one filter's exposures halved.

    A run that must not be broken keeps its first exposures for as long as it asks, and no more.
    """
    if target in problem.repeats:
        return []  # a visit is taken whole or not at all
    least_min = float(problem.contiguous_min[target])
    if least_min > 0.0:
        return [_shortest(problem, parts, least_min)]
    if len(parts) > 1:
        middle = len(parts) // 2
        return [parts[:middle], parts[middle:]]
    line, count = parts[0]
    if count < 2:
        return []
    return [((line, count // 2),), ((line, count - count // 2),)]


def _shortest(problem: Problem, parts: tuple[Part, ...], least_min: float) -> tuple[Part, ...]:
    """Return the first of parts (exposures) that last at least so many minutes together."""
    kept: list[Part] = []
    for line, count in parts:
        each_min = problem.lines[line].each_min
        take = min(count, math.ceil((least_min - 1e-6) / each_min))
        if take <= 0:
            break
        kept.append((line, take))
        least_min -= take * each_min
    return tuple(kept)


@dataclass(frozen=True, slots=True)
class _LineTicks:
    """Lines by tick, and on behind the night's end for the longest block: all shifts are slices.

    ``worth`` (L, K+M+1) is summed up to each tick, per minute. ``reach`` (L, K+M) is how far
    beyond each tick a line may be exposed without a break, in ticks; negative where it may not
    begin.
    """

    ticks: int
    beyond: int
    worth: Singles
    reach: NDArray[np.int32]

    @classmethod
    def of(cls, problem: Problem, longest_min: float) -> _LineTicks:
        lines, ticks = len(problem.lines), _ticks(problem)
        beyond = min(math.ceil(longest_min * TICKS_PER_MIN) + 1, ticks)
        worth = np.empty((lines, ticks + beyond + 1), dtype=np.float32)
        worth[:, 0] = 0.0
        np.cumsum(problem.worth, axis=1, out=worth[:, 2 : ticks + 1 : 2])
        worth[:, 1:ticks:2] = 0.5 * (worth[:, 0:ticks:2] + worth[:, 2 : ticks + 1 : 2])
        worth[:, ticks + 1 :] = worth[:, ticks : ticks + 1]
        reach = np.empty((lines, ticks + beyond), dtype=np.int32)
        ahead = problem.run_end.astype(np.int32)
        closed = ahead < 0
        ahead -= np.arange(problem.minutes, dtype=np.int32)
        ahead *= TICKS_PER_MIN
        ahead[closed] = -1
        reach[:, 0:ticks:2], reach[:, 1:ticks:2] = ahead, ahead - 1
        reach[:, ticks:] = -1
        return cls(ticks, beyond, worth, reach)


def _values(
    problem: Problem, blocks: list[tuple[int, tuple[Part, ...]]], lines: _LineTicks
) -> Singles:
    """Return the value (B, K+1) of each block at each tick."""
    ticks = lines.ticks
    table = np.empty((len(blocks), ticks + 1), dtype=np.float32)
    at_min = np.arange(ticks) / TICKS_PER_MIN
    for row, (target, parts) in enumerate(blocks):
        value, possible = _value_of(problem, parts, lines)
        value += np.float32(_finishes(problem, target, parts))
        if target in problem.pins:
            change_min = problem.lines[parts[0][0]].change_min
            value += pin_worths(problem, target, at_min + change_min)
        value[~possible] = NEVER
        table[row, :-1] = value
    table[:, -1] = NEVER
    return table


def _airmass_parts(problem: Problem) -> dict[int, Places]:
    """Return which part of its airmass each standard of several visits is in at each tick (K,)."""
    found: dict[int, Places] = {}
    for target, each in problem.repeats.items():
        if each.spread is not None:
            minutes = slice(problem.first, problem.first + problem.minutes)
            parts = each.spread.part(problem.night.airmass[target, minutes])
            found[target] = np.repeat(parts, TICKS_PER_MIN)
    return found


def _own_parts(problem: Problem, blocks: list[tuple[int, tuple[Part, ...]]]) -> list[int]:
    """Return the part of its airmass at which each block counts in full; -1 for none of its own."""
    wanting = {
        target: list(each.spread.unsampled)
        for target, each in problem.repeats.items()
        if each.spread is not None
    }
    return [wanting[target].pop(0) if wanting.get(target) else -1 for target, _ in blocks]


def _sample_airmass(
    blocks: list[tuple[int, tuple[Part, ...]]],
    own_parts: list[int],
    parts_at: dict[int, Places],
    table: Singles,
) -> None:
    """Let each visit of a standard count in full in its own part of the airmass, else half."""
    for row, ((target, _), own) in enumerate(zip(blocks, own_parts, strict=True)):
        if target in parts_at:
            elsewhere = parts_at[target] != own
            can = elsewhere & (table[row, :-1] > NEVER)
            table[row, :-1][can] *= np.float32(SAMPLED_SHARE)


def _value_of(
    problem: Problem, parts: tuple[Part, ...], lines: _LineTicks
) -> tuple[Singles, NDArray[np.bool_]]:
    """Return what parts earn begun at each tick (K,), and where they may begin."""
    ticks = lines.ticks
    value = np.zeros(ticks, dtype=np.float32)
    possible = np.ones(ticks, dtype=bool)
    end_min = 0.0
    for place, count in parts:
        line = problem.lines[place]
        begin_min = end_min + line.change_min
        end_min = begin_min + count * line.each_min
        begin = min(round(begin_min * TICKS_PER_MIN), lines.beyond)
        end = min(max(round(end_min * TICKS_PER_MIN), begin + 1), lines.beyond + 1)
        # Exposures times the mean worth of the ticks they take, whatever rounding made of those.
        rate = np.float32(count * line.seconds * TICKS_PER_MIN / (end - begin))
        worth = lines.worth[place]
        value += (worth[end : end + ticks] - worth[begin : begin + ticks]) * rate
        # Half a tick each way, so that the exact times are lawful too.
        first = min(math.floor(begin_min * TICKS_PER_MIN), lines.beyond)
        last = math.ceil((end_min - problem.readout_min) * TICKS_PER_MIN + 0.5)
        possible &= lines.reach[place, first : first + ticks] >= max(last - first, 0)
    return value, possible


def _finishes(problem: Problem, target: int, parts: tuple[Part, ...]) -> float:
    """Return what a block earns by finishing its plan alone."""
    whole = tuple((line, problem.lines[line].count) for line in problem.lines_of(target))
    return float(problem.bonus[target]) if parts == whole else 0.0
