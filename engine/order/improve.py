"""Making an order better: take a stretch of it out, fill it again, keep what is worth more.

The search goes along the order, to its end and back again, so that the tables of
`engine.order.sequence` on either side of a stretch are at hand.
"""

from __future__ import annotations

import time
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from engine.order.blocks import FAR, FAR_BACK, NEVER, TICKS_PER_MIN, Blocks
from engine.order.construct import Start, Turn
from engine.order.pins import PIN_WORTH
from engine.order.sequence import CARRY, Sequence, Timed
from engine.order.travel import Travel

Singles = NDArray[np.float32]
Places = NDArray[np.int64]

# How many visits are taken out together, and how often each number is tried.
STRETCHES = (0, 1, 1, 1, 2, 2, 2, 3, 3, 4, 5, 7)
# Powers of a block's time by which its gain is divided when a stretch is filled.
LEANINGS = (0.0, 0.5, 1.0)
# Moments tried for each block, how many blocks at most, and how many of those from elsewhere.
MOMENTS, POOL, ELSEWHERE = 8, 48, 6
# How far away in the order a block may stand that is moved.
REACH = 30
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
class _Gap:
    """Where blocks are put: the tables, the target and begin before, and the block after."""

    left: Singles
    right: Singles
    here: int
    lasts: float
    after: int | None
    tick: int
    until: int


class Search:
    """The search from one sequence on: `run` it, then ask for the best."""

    def __init__(
        self, blocks: Blocks, travel: Travel, start: Start, first: Turn, seed: int
    ) -> None:
        self._blocks, self._travel, self._start = blocks, travel, start
        self._random = np.random.default_rng(seed)
        near = dict(zip(first.blocks, first.ticks, strict=True))
        self._now = self._best = Sequence(blocks, travel, start, list(first.blocks), near)
        self._targets = blocks.target
        self._lengths = blocks.minutes * TICKS_PER_MIN
        self._rows = np.arange(len(blocks.target)) * (blocks.ticks + 1)
        self._value, self._ready = blocks.value.ravel(), blocks.ready.ravel()
        self._in_series = bool((blocks.series >= 0).any())
        self._in_pieces = bool((blocks.pieces > 0).any())
        self._place, self._back = self._now.held, False

    @property
    def best(self) -> Timed:
        """The best sequence met."""
        return self._best.timed

    def run(self, effort: Effort, wander: float = WANDER, least: float = 0.0) -> Timed:
        """Search until the effort is spent; return the best sequence met.

        At first an order may get worse by the share ``wander`` of its value; each change has to
        gain the share ``least``.
        """
        proven = self._best
        while len(self._targets) and (spent := effort.spent()) < 1.0:
            effort.done += 1
            self._try((wander * (1.0 - spent) ** 2 - least) * self._unpinned())
            if self._now.value > self._best.value * (1.0 + 1e-6):
                self._best = self._now
            self._move_on()
        # Ways were taken as they were where a block stood before: only now it is timed.
        timed = self._best.retimed()
        self._best = timed if timed.value > proven.value else proven
        return self.best

    def _unpinned(self) -> float:
        """Return the best value so far without what pins count for."""
        kept = int(self._blocks.pinned[self._best.order].sum())
        return max(self._best.value - kept * PIN_WORTH, 0.0)

    def _move_on(self) -> None:
        """Go to the next place of the order; at either end, time it and turn round."""
        self._place += -1 if self._back else 1
        if not self._now.held <= self._place <= len(self._now.order):
            self._back = not self._back
            self._now = self._now.retimed()
            self._place = len(self._now.order) if self._back else self._now.held

    def _try(self, slack: float) -> None:
        """Take one stretch out and fill it again; keep it when it isn't worse by more than slack.

        A slack below zero asks for that gain.
        """
        now = self._now
        size = STRETCHES[self._random.integers(len(STRETCHES))]
        if self._back:
            end = max(min(self._place, len(now.order)), now.held)
            begin = max(end - size, now.held)
        else:
            begin = max(min(self._place, len(now.order)), now.held)
            end = min(begin + size, len(now.order))
        filled, value, moved = self._fill(now, begin, end, self._random.random() < 0.5)
        if list(filled.blocks) == now.order[begin:end] or (value < now.value - slack and not moved):
            return
        changed = now.changed(begin, end, filled, moved, self._back)
        for block in moved:
            changed = self._refilled(changed, self._vacated(now, changed, block))
        if self._in_series:
            changed = changed.retimed()
        if changed.value >= now.value - slack:
            self._now = changed

    def _vacated(self, before: Sequence, after: Sequence, block: int) -> int:
        """Return the place in an order at which a block stood that was moved in it."""
        behind = before.order[before.order.index(block) + 1 :]
        places = {other: place for place, other in enumerate(after.order)}
        return next((places[other] for other in behind if other in places), len(after.order))

    def _refilled(self, now: Sequence, place: int) -> Sequence:
        """Return a sequence with what gains most put in at a place."""
        filled, _, _ = self._fill(now, place, place, False)
        return now.changed(place, place, filled, [], self._back) if filled.blocks else now

    def _fill(
        self, now: Sequence, begin: int, end: int, moving: bool
    ) -> tuple[Turn, float, list[int]]:
        """Return blocks for a stretch, the value then, and which stood elsewhere before."""
        here, lasts, after, tick = now.edge(begin - 1, end)
        until = now.ticks[end] if end < len(now.ticks) else self._blocks.ticks
        gap = _Gap(now.before(begin), now.behind(end), here, lasts, after, tick, until)
        pool, loss, elsewhere = self._pool(now, begin, end, gap, moving)
        whole = self._blocks.finishing(now.order)
        lost = 0.0
        if self._in_pieces:
            outside = now.order[:begin] + now.order[end:]
            loss = loss - self._finishing(pool, outside)
            lost = whole - self._blocks.finishing(outside)
        leaning = LEANINGS[self._random.integers(len(LEANINGS))]
        filled: list[int] = []
        moments: list[int] = []
        value = now.joined(gap.left, gap.right, here, lasts, after, tick)
        while pool.size:
            windows = None
            if self._in_series:
                windows = self._windows(pool, begin, end, Turn(tuple(filled), tuple(moments)))
            worth, moment, lag = self._worths(pool, gap, windows)
            gain = worth - value - loss
            noise = self._random.uniform(0.8, 1.2, len(pool))
            score = gain * noise / self._lengths[pool] ** leaning
            chosen = int(score.argmax())
            if gain[chosen] <= 0.0:
                break
            block = int(pool[chosen])
            gap = replace(
                gap,
                left=now.after(gap.left, block, int(lag[chosen])),
                here=int(self._targets[block]),
                lasts=float(self._lengths[block]),
                tick=int(moment[chosen]),
            )
            value = float(worth[chosen])
            filled.append(block)
            moments.append(gap.tick)
            lost += float(loss[chosen])
            # What gains nothing now won't when there is less room.
            kept = gain > 0.0
            kept[chosen] = False
            pool, loss = pool[kept], loss[kept]
        # The tables know nothing of plans that several blocks finish.
        moved = [block for block in filled if block in elsewhere]
        return Turn(tuple(filled), tuple(moments)), value + whole - lost, moved

    def _finishing(self, pool: Places, outside: list[int]) -> Singles:
        """Return what each block earns by finishing a plan: all of it for the last one missing."""
        blocks = self._blocks
        placed = np.bincount(self._targets[outside], minlength=len(blocks.pieces))
        targets = self._targets[pool]
        missing = blocks.pieces[targets] - placed[targets]
        among = ~np.isin(pool, outside)
        earned = blocks.bonus[targets] / np.maximum(missing, 1) ** 2
        found: Singles = np.where((blocks.pieces[targets] > 0) & among, earned, 0.0)
        return found.astype(np.float32)

    def _pool(
        self, now: Sequence, begin: int, end: int, gap: _Gap, moving: bool
    ) -> tuple[Places, Singles, set[int]]:
        """Return the blocks that may fill a stretch, what taking each from its place costs, and
        those that stand elsewhere now.
        """
        free = np.ones(len(self._targets), dtype=bool)
        free[now.order] = False
        waiting = np.flatnonzero(free)
        # Those that may begin at all before what comes after, the best of them first.
        first = self._ready[self._rows[waiting] + min(gap.tick, self._blocks.ticks)]
        waiting, first = (each[first < max(gap.until, gap.tick + 1)] for each in (waiting, first))
        if len(waiting) > POOL:
            rate = self._value[self._rows[waiting] + first] / self._lengths[waiting]
            rate *= self._random.uniform(0.4, 1.0, len(waiting))
            waiting = waiting[np.argpartition(-rate, POOL)[:POOL]]
        own = np.array(now.order[begin:end], dtype=np.int64)
        others: list[int] = []
        losses: list[float] = []
        if moving:
            near = [
                place
                for place in range(max(begin - REACH, now.held), min(end + REACH, len(now.order)))
                # Visits of a series are bound to each other: they are not moved one by one.
                if not begin <= place < end and self._blocks.series[now.order[place]] < 0
            ]
            for at in self._random.permutation(len(near))[:ELSEWHERE]:
                others.append(now.order[near[at]])
                losses.append(max(now.worth - now.without(near[at]), 0.0))
        pool = np.concatenate([waiting, own, np.array(others, dtype=np.int64)])
        loss = np.zeros(len(pool), dtype=np.float32)
        loss[len(pool) - len(others) :] = losses
        return pool, loss, set(others)

    def _windows(
        self, pool: Places, begin: int, end: int, filled: Turn
    ) -> tuple[Places, Places] | None:
        """Return the first and last tick at which each block may begin for its series' sake.

        As far as the visits around a stretch are where they are; None when the pool has none.
        """
        blocks, now = self._blocks, self._now
        bound = np.flatnonzero(blocks.series[pool] >= 0)
        if not bound.size:
            return None
        before = [
            *zip(now.order[:begin], now.ticks[:begin], strict=True),
            *zip(filled.blocks, filled.ticks, strict=True),
        ]
        behind = list(zip(now.order[end:], now.ticks[end:], strict=True))
        first = np.full(len(pool), FAR_BACK, dtype=np.int64)
        last = np.full(len(pool), FAR, dtype=np.int64)
        for row in bound:
            block = int(pool[row])
            series, least, greatest = (
                int(each[block]) for each in (blocks.series, blocks.least, blocks.greatest)
            )
            mates = [tick for other, tick in before if blocks.series[other] == series]
            mate = max(mates, default=blocks.last[series])
            if mate > FAR_BACK:
                first[row], last[row] = mate + least, mate + greatest
            mates = [tick for other, tick in behind if blocks.series[other] == series]
            if mates:
                first[row] = max(first[row], min(mates) - greatest)
                last[row] = min(last[row], min(mates) - least)
        return first, last

    def _worths(
        self, pool: Places, gap: _Gap, windows: tuple[Places, Places] | None
    ) -> tuple[Singles, Places, Places]:
        """Return each block's best value in a gap, its moment, and its lag from the left."""
        ticks = self._blocks.ticks
        minute = np.array(min(int(gap.tick + gap.lasts), ticks - 1) // TICKS_PER_MIN)
        there, rows = self._targets[pool], self._rows[pool]
        to = self._travel.between(np.array(gap.here), there, minute)
        lag = (gap.lasts + to * TICKS_PER_MIN + CARRY).astype(np.int64)
        onward = self._lengths[pool] + np.float32(CARRY)
        if gap.after is not None:
            way = self._travel.between(there, self._targets[gap.after], minute)
            onward = onward + way * TICKS_PER_MIN
        # The earliest moment and some more, spread over the stretch.
        width = max(gap.until - gap.tick, 4)
        spread = (np.arange(MOMENTS) * (width / MOMENTS)).astype(np.int64)
        arrive = np.minimum(gap.tick + lag, ticks)
        if windows is not None:
            arrive = np.clip(windows[0], arrive, ticks)
        first = self._ready.take(rows + arrive)
        moments = np.minimum(first[:, None] + spread, ticks)
        worths = gap.left.take(moments - lag[:, None])
        worths += self._value.take(moments + rows[:, None])
        leave = moments + onward.astype(np.int64)[:, None]
        worths += gap.right.take(np.minimum(leave, ticks))
        if windows is not None:
            worths[moments > windows[1][:, None]] = NEVER
        best = worths.argmax(axis=1)
        at = np.arange(len(pool)) * MOMENTS + best
        return worths.take(at), moments.take(at), lag
