"""Making an order better: take a stretch of it out, fill it again, keep what is worth more.

Before and behind every visit stands a table of what the rest is worth by the tick at which it is
entered, with every visit begun at its best moment. So a change in the middle is valued exactly
without going through the order again. In symbols, for blocks 0 to P-1 in turn with values v:

    behind_i(s) = max over s' >= s of v_i(s') + behind_i+1(s' + time of i and way to i+1)
    before_i(s) = max over s' <= s of v_i(s') + before_i-1(s' - time of i-1 and way to i)
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine.order.blocks import NEVER, TICKS_PER_MIN, Blocks
from engine.order.construct import Start, Turn
from engine.order.pins import PIN_WORTH
from engine.order.travel import Travel

Singles = NDArray[np.float32]
Places = NDArray[np.int64]

# How many visits are taken out together, and how often each number is tried.
STRETCHES = (0, 1, 1, 1, 2, 2, 2, 3, 3, 4, 5, 7)
# Powers of a block's time by which its gain is divided when a stretch is filled.
LEANINGS = (0.0, 0.5, 1.0)
# Lags are rounded down after this is added. Half would be fair, but a search picks out what was
# rounded down; with many short visits that made orders that were late by an hour at dawn.
CARRY = 0.65
# Moments tried for each block, and how many blocks at most.
MOMENTS, POOL = 10, 160
# At first an order may get worse by this share of its value; at the end not at all.
WANDER = 0.004


@dataclass(slots=True)
class Effort:
    """How long to search: until a moment (s, of `time.perf_counter`) or for so many steps."""

    until_s: float | None = None
    steps: int | None = None
    begun_s: float = 0.0
    done: int = 0

    def with_reserve(self, share: float) -> Effort:
        """Return the effort less a share of the time used so far, kept for what comes after."""
        if self.until_s is None:
            return self
        used_s = time.perf_counter() - self.begun_s
        return replace(self, until_s=self.until_s - share * used_s)

    def spent(self) -> float:
        """Return the share of the effort that is used up; 1 or more when it is over."""
        shares = [1.0] if self.until_s is None and self.steps is None else []
        if self.until_s is not None:
            now_s = time.perf_counter()
            shares.append((now_s - self.begun_s) / max(self.until_s - self.begun_s, 1e-9))
        if self.steps is not None:
            shares.append(self.done / self.steps if self.steps else 1.0)
        return max(shares)


@dataclass(frozen=True, slots=True)
class Timed(Turn):
    """A turn in which every block begins at its best moment, and what it is worth."""

    value: float


class Sequence:
    """One sequence of blocks with its tables before and behind each.

    ``near`` says about when each block begins, for ways that change through the night. A sequence
    that differs from another only between two places takes over its tables on either side.
    """

    def __init__(
        self,
        blocks: Blocks,
        travel: Travel,
        start: Start,
        order: list[int],
        near: dict[int, int],
        like: Shared | None = None,
    ) -> None:
        self._blocks, self._travel, self._start = blocks, travel, start
        self._width = blocks.ticks + 1
        self._zeros = np.zeros(self._width, dtype=np.float32)
        self._entry = np.full(self._width, NEVER, dtype=np.float32)
        self._entry[start.tick :] = 0.0
        self.order = order
        self.ticks = [near.get(block, start.tick) for block in order]
        self._make_behind(like)
        self._time()
        self._make_before(like)

    def _make_behind(self, like: Shared | None = None) -> None:
        places = len(self.order)
        kept = min(like.after, places) if like else 0
        self.behind: list[Singles] = [self._zeros] * (places + 1)
        self._chosen: list[Singles] = [self._zeros] * places
        if like and kept:
            self.behind[places - kept :] = like.sequence.behind[len(like.sequence.order) - kept :]
            self._chosen[places - kept :] = like.sequence._chosen[len(like.sequence.order) - kept :]
        for place in range(places - kept - 1, -1, -1):
            right = self.behind[place + 1]
            worth = self._blocks.value[self.order[place]] + _later(right, self._lag(place))
            self._chosen[place] = worth
            self.behind[place] = _best_from(np.maximum(worth, right))

    def _make_before(self, like: Shared | None) -> None:
        kept = 0
        if like and self.order[: like.before] == like.sequence.order[: like.before]:
            kept = like.before
        self.before: list[Singles] = like.sequence.before[:kept] if like else []
        for place in range(kept, len(self.order)):
            left = self.before[-1] if place else self._entry
            self.before.append(self.before_of(self.order[place], left, self._lag(place - 1)))

    def _time(self) -> None:
        """Go through the order with every block at its best moment; drop what is left behind."""
        kept, ticks, worth = list[int](), list[int](), 0.0
        here, leaves = self._start.here, float(self._start.tick)
        for place, block in enumerate(self.order):
            at = int(leaves + self.way(here, block, round(leaves)) + CARRY)
            if at >= self._width - 1:
                break
            ahead = self._chosen[place][at:]
            best = int(ahead.argmax())
            if place < len(self._start.first) and block == self._start.first[place]:
                # Wanted first: as soon as it may be, whatever else that costs.
                best = int(self._blocks.ready[block, at]) - at
                if at + best >= self._width - 1:
                    continue
            elif ahead[best] < self.behind[place + 1][at] or ahead[best] < 0.0:
                continue
            kept.append(block)
            ticks.append(at + best)
            worth += float(self._blocks.value[block, at + best])
            here = int(self._blocks.target[block])
            leaves = at + best + float(self._blocks.minutes[block]) * TICKS_PER_MIN
        dropped = len(kept) < len(self.order)
        self.order, self.ticks = kept, ticks
        if dropped:
            self._make_behind()
        # Worth is without what finishing plans of several blocks earns, value with it.
        self.worth = worth
        self.value = worth + self._blocks.finishing(kept)

    def before_of(self, block: int, left: Singles, lag: int) -> Singles:
        """Return the table before, with one more block after what is to its left."""
        here = self._blocks.value[block] + _earlier(left, lag)
        found: Singles = np.maximum.accumulate(here)
        return found

    # Lags: ticks from the begin of one block to the begin of the next

    def _lag(self, place: int) -> int:
        """Return the lag from the block at a place (-1: the start) to the one after it."""
        here, lasts, at = self._start.here, 0.0, self._start.tick
        if place >= 0:
            block = self.order[place]
            here, at = int(self._blocks.target[block]), self.ticks[place]
            lasts = float(self._blocks.minutes[block]) * TICKS_PER_MIN
        if place + 1 >= len(self.order):
            return round(lasts)
        return int(lasts + self.way(here, self.order[place + 1], round(at + lasts)) + CARRY)

    def way(self, here: int, block: int, tick: int) -> float:
        """Return the ticks (not rounded) from a target to a block's at a tick."""
        minute = min(tick // TICKS_PER_MIN, (self._width - 2) // TICKS_PER_MIN)
        there = int(self._blocks.target[block])
        travel = self._travel
        which = (
            travel.stretch(minute)
            if travel.step_min
            else travel.west[here, minute] ^ travel.west[there, minute]
        )
        return float(travel.tables[which, here, there]) * TICKS_PER_MIN

    @property
    def entry(self) -> Singles:
        """The table before the first block."""
        return self._entry


@dataclass(frozen=True, slots=True)
class Shared:
    """A sequence another one is made from: the first and last so many blocks are the same."""

    sequence: Sequence
    before: int
    after: int


def _best_from(table: Singles) -> Singles:
    """Return the greatest value at or after each tick."""
    found: Singles = np.maximum.accumulate(table[::-1])[::-1]
    return found


def _later(table: Singles, lag: int) -> Singles:
    """Return a table read a number of ticks later; nothing is worth anything past the end."""
    moved = np.zeros_like(table)
    if lag < len(table):
        moved[: len(table) - lag] = table[lag:]
    return moved


def _earlier(table: Singles, lag: int) -> Singles:
    """Return a table read a number of ticks earlier; nothing begins before the night."""
    moved = np.full_like(table, NEVER)
    if lag < len(table):
        moved[lag:] = table[: len(table) - lag]
    return moved


class Search:
    """The search from one sequence on: `run` it, then ask for the best."""

    def __init__(
        self, blocks: Blocks, travel: Travel, start: Start, first: Turn, seed: int
    ) -> None:
        self._blocks, self._travel, self._start = blocks, travel, start
        self._random = np.random.default_rng(seed)
        near = dict(zip(first.blocks, first.ticks, strict=True))
        self._now = Sequence(blocks, travel, start, list(first.blocks), near)
        self.best = self._timed(self._now)
        self._targets = blocks.target
        self._lengths = blocks.minutes * TICKS_PER_MIN

    def run(self, effort: Effort, wander: float = WANDER, least: float = 0.0) -> Timed:
        """Search until the effort is spent; return the best sequence met.

        At first an order may get worse by the share ``wander`` of its value; each change has to
        gain the share ``least``.
        """
        held = len(self._start.first)
        while len(self._targets) and (spent := effort.spent()) < 1.0:
            effort.done += 1
            self._try(held, (wander * (1.0 - spent) ** 2 - least) * self._unpinned())
            if self._now.value > self.best.value * (1.0 + 1e-6):
                self.best = self._timed(self._now)
        return self.best

    def _unpinned(self) -> float:
        """Return the best value so far without what pins count for."""
        kept = int(self._blocks.pinned[list(self.best.blocks)].sum())
        return max(self.best.value - kept * PIN_WORTH, 0.0)

    def _timed(self, sequence: Sequence) -> Timed:
        return Timed(tuple(sequence.order), tuple(sequence.ticks), sequence.value)

    def _try(self, held: int, slack: float) -> None:
        """Take one stretch out and fill it again; keep it when it isn't worse by more than slack.

        A slack below zero asks for that gain.
        """
        now = self._now
        size = STRETCHES[self._random.integers(len(STRETCHES))]
        places = len(now.order)
        held = min(held, places)
        begin = int(self._random.integers(held, max(places - size, held) + 1))
        end = min(begin + size, places)
        filled, moments, value, moved = self._fill(begin, end)
        if value < now.value - slack or filled == now.order[begin:end]:
            return
        elsewhere = set(moved)
        order = [
            *(b for b in now.order[:begin] if b not in elsewhere),
            *filled,
            *(b for b in now.order[end:] if b not in elsewhere),
        ]
        near = dict(zip(now.order, now.ticks, strict=True))
        near.update(zip(filled, moments, strict=True))
        like = None if elsewhere else Shared(now, begin, places - end)
        changed = Sequence(self._blocks, self._travel, self._start, order, near, like)
        if changed.value >= now.value - slack:
            self._now = changed

    def _fill(self, begin: int, end: int) -> tuple[list[int], list[int], float, list[int]]:
        """Return blocks for a stretch, their ticks, the value, and which stood elsewhere before."""
        now = self._now
        left = now.before[begin - 1] if begin else now.entry
        right = now.behind[end]
        here = int(self._targets[now.order[begin - 1]]) if begin else self._start.here
        lasts = float(self._lengths[now.order[begin - 1]]) if begin else 0.0
        begin_tick = now.ticks[begin - 1] if begin else self._start.tick
        after = now.order[end] if end < len(now.order) else None
        end_tick = now.ticks[end] if end < len(now.ticks) else self._blocks.ticks
        pool, loss = self._pool(begin, end)
        loss = loss - self._finishing(pool, begin, end)
        leaning = LEANINGS[self._random.integers(len(LEANINGS))]
        elsewhere = {*now.order[:begin], *now.order[end:]}
        filled: list[int] = []
        moments: list[int] = []
        moved: list[int] = []
        lost = self._blocks.finishing(now.order) - self._blocks.finishing(
            now.order[:begin] + now.order[end:]
        )
        tick = begin_tick
        value = self._closed(left, right, here, lasts, after, tick)
        while pool.size:
            span = max(end_tick - tick, 4)
            worth, moment, lag = self._worths(
                pool, left, right, here, lasts, after, (tick, tick + span)
            )
            gain = worth - value - loss
            noise = self._random.uniform(0.8, 1.2, len(pool)).astype(np.float32)
            score = gain * noise / self._lengths[pool] ** leaning
            chosen = int(score.argmax())
            if gain[chosen] <= 0.0:
                break
            block = int(pool[chosen])
            left = now.before_of(block, left, int(lag[chosen]))
            here, lasts = int(self._targets[block]), float(self._lengths[block])
            tick, value = int(moment[chosen]), float(worth[chosen])
            filled.append(block)
            moments.append(tick)
            lost += float(loss[chosen])
            if block in elsewhere:
                moved.append(block)
            pool, loss = np.delete(pool, chosen), np.delete(loss, chosen)
        # The tables know nothing of plans that several blocks finish.
        return filled, moments, value + self._blocks.finishing(now.order) - lost, moved

    def _finishing(self, pool: Places, begin: int, end: int) -> Singles:
        """Return what each block earns by finishing a plan: all of it for the last one missing."""
        now, blocks = self._now, self._blocks
        outside = now.order[:begin] + now.order[end:]
        placed = np.bincount(self._targets[outside], minlength=len(blocks.pieces))
        targets = self._targets[pool]
        missing = blocks.pieces[targets] - placed[targets]
        among = ~np.isin(pool, outside)
        earned = blocks.bonus[targets] / np.maximum(missing, 1) ** 2
        found: Singles = np.where((blocks.pieces[targets] > 0) & among, earned, 0.0)
        return found.astype(np.float32)

    def _closed(
        self, left: Singles, right: Singles, here: int, lasts: float, after: int | None, tick: int
    ) -> float:
        """Return the value when nothing more comes between left and right."""
        lag = 0
        if after is not None:
            lag = int(lasts + self._now.way(here, after, round(tick + lasts)) + CARRY)
        return float((left + _later(right, lag)).max())

    def _pool(self, begin: int, end: int) -> tuple[Places, Singles]:
        """Return the blocks that may fill a stretch, and what taking each from its place costs."""
        now = self._now
        loss = np.zeros(len(self._targets), dtype=np.float32)
        outside = now.order[:begin] + now.order[end:]
        loss[outside] = np.inf
        near = range(len(self._start.first), len(now.order))
        if len(near) > 0 and self._random.random() < 0.5:
            for place in self._random.choice(near, size=min(6, len(near)), replace=False):
                if not begin <= place < end:
                    loss[now.order[place]] = self._loss(int(place))
        pool = np.flatnonzero(np.isfinite(loss))
        if len(pool) > POOL:
            own = now.order[begin:end]
            pool = np.union1d(self._random.choice(pool, POOL, replace=False), own).astype(np.int64)
        return pool, loss[pool]

    def _loss(self, place: int) -> float:
        """Return what an order loses without the block at a place."""
        now = self._now
        left = now.before[place - 1] if place else now.entry
        here = int(self._targets[now.order[place - 1]]) if place else self._start.here
        lasts = float(self._lengths[now.order[place - 1]]) if place else 0.0
        after = now.order[place + 1] if place + 1 < len(now.order) else None
        tick = now.ticks[place - 1] if place else self._start.tick
        without = self._closed(left, now.behind[place + 1], here, lasts, after, tick)
        return max(now.worth - without, 0.0)

    def _worths(
        self,
        pool: Places,
        left: Singles,
        right: Singles,
        here: int,
        lasts: float,
        after: int | None,
        span: tuple[int, int],
    ) -> tuple[Singles, Places, Places]:
        """Return each block's best value between left and right, its moment, its lag from left."""
        ticks = self._blocks.ticks
        minute = np.array(min(int(span[0] + lasts), ticks - 1) // TICKS_PER_MIN)
        there = self._targets[pool]
        to = self._travel.between(np.array(here), there, minute)
        lag = (lasts + to * TICKS_PER_MIN + CARRY).astype(np.int64)
        onward = self._lengths[pool]
        if after is not None:
            way = self._travel.between(there, self._targets[after], minute)
            onward = onward + way * TICKS_PER_MIN
        # The earliest moment and some more, spread over the stretch.
        spread = (np.arange(MOMENTS) * ((span[1] - span[0]) / MOMENTS)).astype(np.int64)
        arrive = np.minimum(span[0] + lag, ticks)
        first = self._blocks.ready[pool, arrive]
        moments = np.minimum(first[:, None] + spread[None], ticks)
        worths = (
            left[moments - lag[:, None]]
            + self._blocks.value[pool[:, None], moments]
            + right[np.minimum(moments + (onward + CARRY).astype(np.int64)[:, None], ticks)]
        )
        best = worths.argmax(axis=1)
        rows = np.arange(len(pool))
        return worths[rows, best], moments[rows, best], lag
