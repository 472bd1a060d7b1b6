"""First orders: a handful of greedies that each take the best next block, built side by side.

They differ in how dear they hold time, how much they mind what a block would still bring later,
and how they feel urgency. Two of them are the plain rules a person would use; they stay in the
ensemble, so no order is ever worse than those.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.order.blocks import FAR, FAR_BACK, NEVER, TICKS_PER_MIN, Blocks
from engine.order.travel import Travel

Singles = NDArray[np.float32]
Places = NDArray[np.int64]


@dataclass(frozen=True, slots=True)
class Temper:
    """How one greedy weighs things.

    ``price`` times the price of the time a block takes is subtracted from its value, ``regret``
    times the best it would still bring later as well; the rest is divided by its time to the
    power ``per_time``. Blocks whose last chance is within about ``felt_min`` minutes count up to
    ``1 + urgency`` times.
    """

    price: float
    regret: float
    per_time: float
    urgency: float = 0.0
    felt_min: float = 60.0


VALUE_FIRST = Temper(0.0, 0.0, 1.0)
URGENT = Temper(0.0, 0.0, 1.0, urgency=1.5)
TEMPERS = (
    VALUE_FIRST,
    URGENT,
    Temper(1.2, 0.8, 0.5, urgency=1.0),
    Temper(1.0, 0.5, 1.0),
    Temper(1.0, 1.0, 0.0, urgency=1.0),
    Temper(1.0, 0.8, 1.0),
    Temper(1.2, 0.5, 0.5),
)


@dataclass(frozen=True, slots=True)
class Start:
    """Where and when orders begin: the target pointed at, the tick, and blocks to take first."""

    here: int
    tick: int
    first: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class Turn:
    """Blocks in turn, and the tick at which each begins."""

    blocks: tuple[int, ...]
    ticks: tuple[int, ...]


def greedies(
    blocks: Blocks, travel: Travel, price: Singles, start: Start, tempers: tuple[Temper, ...]
) -> list[Turn]:
    """Return one turn of blocks for each temper."""
    rows, ticks = len(tempers), blocks.ticks
    if not len(blocks.target) or ticks == 0:
        return [Turn((), ())] * rows
    tables = _Tables.of(blocks, price, tempers)
    held, tick, here = _after_first(blocks, travel, start)
    sequences = [list(held.blocks) for _ in range(rows)]
    moments = [list(held.ticks) for _ in range(rows)]
    state_tick = np.full(rows, tick)
    state_here = np.full(rows, here)
    gaps = _Gaps.of(blocks, rows)
    free = np.ones((rows, len(blocks.target)), dtype=bool)
    free[:, list(start.first)] = False
    active = np.ones(rows, dtype=bool)
    row_index = np.arange(rows)
    while active.any():
        minute = np.minimum(state_tick // TICKS_PER_MIN, ticks // TICKS_PER_MIN - 1)
        way = travel.between(state_here[:, None], blocks.target[None], minute[:, None])
        arrive = np.minimum(state_tick[:, None] + np.rint(way * TICKS_PER_MIN).astype(int), ticks)
        if gaps is not None:
            arrive = np.minimum(np.maximum(arrive, gaps.first()), ticks)
        begin = tables.ready.take(tables.row + arrive)
        score = tables.score(begin, state_tick)
        score[~free] = -np.inf
        if gaps is not None:
            score[begin > gaps.last()] = -np.inf
        if blocks.pinned.any():
            _wait_for_pins(blocks, travel, score, begin, free)
        chosen = score.argmax(axis=1)
        active &= np.isfinite(score[row_index, chosen])
        for row in np.flatnonzero(active).tolist():
            block = int(chosen[row])
            sequences[row].append(block)
            moments[row].append(int(begin[row, block]))
            free[row, block] = False
            state_tick[row] = begin[row, block] + tables.length[block]
            state_here[row] = blocks.target[block]
            if gaps is not None:
                gaps.take(row, block, int(begin[row, block]))
        state_tick = np.minimum(state_tick, ticks)
    return [Turn(tuple(s), tuple(m)) for s, m in zip(sequences, moments, strict=True)]


@dataclass(slots=True)
class _Gaps:
    """When the last visit of every series began, for each greedy (G, B)."""

    blocks: Blocks
    since: Places

    @classmethod
    def of(cls, blocks: Blocks, rows: int) -> _Gaps | None:
        """Return what binds the visits of series at first; None when there are none."""
        if not (blocks.series >= 0).any():
            return None
        since = [blocks.last.get(int(target), FAR_BACK) for target in blocks.series]
        return cls(blocks, np.repeat(np.array([since], dtype=np.int64), rows, axis=0))

    def first(self) -> Places:
        """Return the first tick at which each block may begin."""
        return np.where(self.since > FAR_BACK, self.since + self.blocks.least, 0)

    def last(self) -> Places:
        """Return the last tick at which each block may begin."""
        return np.where(self.since > FAR_BACK, self.since + self.blocks.greatest, FAR)

    def take(self, row: int, block: int, tick: int) -> None:
        """Remember that a greedy has a visit begin at a tick."""
        series = self.blocks.series[block]
        if series >= 0:
            self.since[row, self.blocks.series == series] = tick


def _wait_for_pins(
    blocks: Blocks, travel: Travel, score: Singles, begin: Places, free: NDArray[np.bool_]
) -> None:
    """Take out of the scores (G, B) what would make the next pinned block late, and the pinned one
    itself as long as anything else can be done before it.
    """
    ticks = blocks.ticks
    lengths = np.rint(blocks.minutes * TICKS_PER_MIN).astype(np.int64)
    for row in range(len(score)):
        due = np.where(blocks.pinned & free[row] & np.isfinite(score[row]), begin[row], ticks + 1)
        pinned = int(due.argmin())
        if due[pinned] > ticks:
            continue
        end = begin[row] + lengths
        minute = np.minimum(end, ticks - 1) // TICKS_PER_MIN
        way = travel.between(blocks.target, blocks.target[pinned], minute)
        in_time = end + np.ceil(way * TICKS_PER_MIN) <= due[pinned]
        score[row, ~in_time & ~blocks.pinned] = -np.inf
        score[row, blocks.pinned & (np.arange(len(due)) != pinned)] = -np.inf
        if (score[row, in_time & ~blocks.pinned] > -np.inf).any():
            score[row, pinned] = -np.inf


def _after_first(blocks: Blocks, travel: Travel, start: Start) -> tuple[Turn, int, int]:
    """Return the blocks that were to come first, and the tick and target after them."""
    tick, here = start.tick, start.here
    held: list[int] = []
    ticks: list[int] = []
    for block in start.first:
        there = int(blocks.target[block])
        at = np.array(min(tick, blocks.ticks - 1) // TICKS_PER_MIN)
        way = float(travel.between(np.array(here), np.array(there), at))
        arrive = min(tick + round(way * TICKS_PER_MIN), blocks.ticks)
        possible = np.flatnonzero(blocks.value[block, arrive:] > NEVER)
        if possible.size:
            held.append(block)
            ticks.append(arrive + int(possible[0]))
            tick = ticks[-1] + round(float(blocks.minutes[block]) * TICKS_PER_MIN)
            here = there
    return Turn(tuple(held), tuple(ticks)), min(tick, blocks.ticks), here


@dataclass(frozen=True, slots=True)
class _Columns:
    """The tempers as columns (G, 1); ``urgent`` are the rows that feel urgency at all."""

    price: Singles
    regret: Singles
    per_time: Singles
    urgency: Singles
    felt_ticks: Singles
    urgent: Places

    @classmethod
    def of(cls, tempers: tuple[Temper, ...]) -> _Columns:
        def column(name: str) -> Singles:
            return np.array([[getattr(temper, name)] for temper in tempers], dtype=np.float32)

        urgency = column("urgency")
        return cls(
            column("price"),
            column("regret"),
            column("per_time"),
            urgency,
            column("felt_min") * TICKS_PER_MIN,
            np.flatnonzero(urgency > 0.0),
        )


@dataclass(frozen=True, slots=True)
class _Tables:
    """What every greedy reads: by block (B,), or by block and tick and laid out flat (B (K+1),),
    with where each block's ticks begin in ``row``.
    """

    columns: _Columns
    ticks: int
    row: Places
    length: Places
    ready: Places
    value: Singles
    paid: Singles
    later: Singles
    last: Places

    @classmethod
    def of(cls, blocks: Blocks, price: Singles, tempers: tuple[Temper, ...]) -> _Tables:
        ticks = blocks.ticks
        possible = blocks.value > NEVER
        length = np.rint(blocks.minutes * TICKS_PER_MIN).astype(np.int64)
        paid = np.zeros(ticks + 1, dtype=np.float32)
        np.cumsum(price, out=paid[1:])
        ends = np.minimum(np.arange(ticks + 1)[None] + length[:, None], ticks)
        net = blocks.value - paid.take(ends)
        net += paid
        # What may not begin has no value to speak of, far below zero.
        np.maximum(net, 0.0, out=net)
        later = np.maximum.accumulate(net[:, ::-1], axis=1)[:, ::-1]
        return cls(
            _Columns.of(tempers),
            ticks,
            np.arange(len(blocks.target)) * (ticks + 1),
            length,
            blocks.ready.ravel(),
            blocks.value.ravel(),
            paid,
            later.ravel(),
            ticks - np.argmax(possible[:, ::-1], axis=1),
        )

    def score(self, begin: Places, now: Places) -> Singles:
        """Return how good each block (G, B) is that would begin when said, for each greedy."""
        columns = self.columns
        value = self.value.take(self.row + begin)
        end = np.minimum(begin + self.length, self.ticks)
        cost = self.paid.take(end)
        cost -= self.paid.take(now)[:, None]
        soon = np.minimum(begin + 20 * TICKS_PER_MIN, self.ticks)
        net = value - columns.price * cost
        net -= columns.regret * self.later.take(self.row + soon)
        taken = np.maximum(end - now[:, None], 1).astype(np.float32)
        score: Singles = net / taken**columns.per_time
        rows = columns.urgent
        slack = np.maximum(self.last - begin[rows], 0).astype(np.float32) / columns.felt_ticks[rows]
        # Only what is worth taking can be urgent.
        haste = np.where(net[rows] > 0.0, 1.0 + columns.urgency[rows] * np.exp(-slack), 1.0)
        score[rows] *= haste.astype(np.float32)
        score[value <= NEVER] = -np.inf
        return score
