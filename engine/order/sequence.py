"""One sequence of blocks, and what the rest is worth before and behind every place in it.

Before and behind every block stands a table of what the rest is worth by the tick at which it is
entered, with every block begun at its best moment. So a change in the middle is valued exactly
without going through the order again. In symbols, for blocks 0 to P-1 in turn with values v:

    behind_i(s) = max over s' >= s of v_i(s') + behind_i+1(s' + time of i and way to i+1)
    before_i(s) = max over s' <= s of v_i(s') + before_i-1(s' - time of i-1 and way to i)

Tables are made when they are asked for. A sequence made from another by a change in the middle
takes over those on either side, so a search that moves along the order makes one or two a step.

Tables know nothing of what binds visits of one series to each other: only timing a sequence does.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from engine.order.blocks import FAR_BACK, NEVER, TICKS_PER_MIN, Blocks
from engine.order.construct import Start, Turn
from engine.order.repeats import SAMPLED_SHARE
from engine.order.travel import Travel

Singles = NDArray[np.float32]
Places = NDArray[np.int64]

# Lags are rounded down after this is added. Half would be fair, but a search picks out what was
# rounded down; with many short visits that made orders that were late by an hour at dawn.
CARRY = 0.65


@dataclass(frozen=True, slots=True)
class Timed(Turn):
    """A turn in which every block begins at its best moment, and what it is worth."""

    value: float


class Sequence:
    """One sequence of blocks, timed, with its tables before and behind each.

    ``near`` says about when each block begins, for ways that change through the night. So many
    blocks at its begin are ``held``: the observer wants them first.
    """

    __slots__ = (
        "_before",
        "_behind",
        "_blocks",
        "_chosen",
        "_start",
        "_travel",
        "held",
        "order",
        "ticks",
        "value",
        "worth",
    )

    def __init__(
        self, blocks: Blocks, travel: Travel, start: Start, order: list[int], near: dict[int, int]
    ) -> None:
        self._blocks, self._travel, self._start = blocks, travel, start
        self.order = order
        self.ticks = [near.get(block, start.tick) for block in order]
        self.held = 0
        self._forget()
        self._time()

    def _forget(self) -> None:
        """Begin the tables anew: `_before` from the start, `_behind` from the end of the night."""
        width = self._blocks.ticks + 1
        entry = np.full(width, NEVER, dtype=np.float32)
        entry[self._start.tick :] = 0.0
        self._before: list[Singles] = [entry]
        self._behind: list[Singles] = [np.zeros(width, dtype=np.float32)]
        # What lies behind a place with its block begun at a tick, whatever that costs.
        self._chosen: list[Singles] = []

    def before(self, place: int) -> Singles:
        """Return what all blocks before a place are worth, by the last tick one may begin at."""
        while len(self._before) <= place:
            last = len(self._before) - 1
            left, block = self._before[-1], self.order[last]
            table = self.after(left, block, self._lag(last - 1))
            if last < self.held:
                # Wanted first: begun when it is begun, no later for anything's sake.
                tick = self.ticks[last]
                table[:tick], table[tick:] = NEVER, table[tick]
            self._before.append(table)
        return self._before[place]

    def behind(self, place: int) -> Singles:
        """Return what all blocks from a place on are worth, by the first tick one may begin at."""
        places = len(self.order)
        while len(self._behind) <= places - place:
            first = places - len(self._behind)
            right = self._behind[-1]
            worth = self._blocks.value[self.order[first]] + later(right, self._lag(first))
            self._chosen.append(worth)
            self._behind.append(_best_from(np.maximum(worth, right)))
        return self._behind[places - place]

    def after(self, left: Singles, block: int, lag: int) -> Singles:
        """Return the table before, with one more block after what is to its left."""
        found: Singles = np.maximum.accumulate(self._blocks.value[block] + _earlier(left, lag))
        return found

    def changed(
        self, begin: int, end: int, filled: Turn, moved: list[int], read_behind: bool
    ) -> Sequence:
        """Return the sequence with other blocks between two places, some moved from elsewhere.

        Its worth is read at the end of the new ones or, if asked, at their begin: whichever
        tables are wanted next.
        """
        gone = [self.order.index(block) for block in moved]
        early = [place for place in gone if place < begin]
        late = [place for place in gone if place >= end]
        ahead = [place for place in range(begin) if place not in early]
        rest = [place for place in range(end, len(self.order)) if place not in late]
        new = object.__new__(Sequence)
        new._blocks, new._travel, new._start = self._blocks, self._travel, self._start
        new.held = self.held
        new.order, new.ticks = (
            [*(now[p] for p in ahead), *fresh, *(now[p] for p in rest)]
            for now, fresh in ((self.order, filled.blocks), (self.ticks, filled.ticks))
        )
        new._before = self._before[: min(early, default=begin) + 1]
        same = len(self.order) - max([end, *(place + 1 for place in late)])
        new._behind, new._chosen = self._behind[: same + 1], self._chosen[:same]
        new.worth = new.worth_at(len(ahead) + (0 if read_behind else len(filled.blocks)))
        new.value = new.worth + self._blocks.finishing(new.order)
        return new

    def worth_at(self, place: int) -> float:
        """Return what all blocks are worth together, from the tables that meet at a place."""
        return self.joined(self.before(place), self.behind(place), *self.edge(place - 1, place))

    def edge(self, last: int, after: int) -> tuple[int, float, int | None, int]:
        """Return target, ticks and begin of a place (-1: the start), and the block after it."""
        follows = self.order[after] if after < len(self.order) else None
        if last < 0:
            return self._start.here, 0.0, follows, self._start.tick
        block = self.order[last]
        lasts = float(self._blocks.minutes[block]) * TICKS_PER_MIN
        return int(self._blocks.target[block]), lasts, follows, self.ticks[last]

    def joined(
        self, left: Singles, right: Singles, here: int, lasts: float, after: int | None, tick: int
    ) -> float:
        """Return the value when nothing more comes between left and right."""
        lag = 0
        if after is not None:
            lag = int(lasts + self.way(here, after, round(tick + lasts)) + CARRY)
        return float((left + later(right, lag)).max())

    def without(self, place: int) -> float:
        """Return what a sequence is worth without the block at a place."""
        edge = self.edge(place - 1, place + 1)
        return self.joined(self.before(place), self.behind(place + 1), *edge)

    def retimed(self) -> Sequence:
        """Return the same sequence with every block at its best moment."""
        near = dict(zip(self.order, self.ticks, strict=True))
        return Sequence(self._blocks, self._travel, self._start, self.order, near)

    @property
    def timed(self) -> Timed:
        """The sequence as it stands, for keeping."""
        return Timed(tuple(self.order), tuple(self.ticks), self.value)

    def _time(self) -> None:
        """Go through the order with every block at its best moment; drop what is left behind."""
        self.behind(0)
        kept, ticks, worth, held = list[int](), list[int](), 0.0, 0
        here, leaves = self._start.here, float(self._start.tick)
        night, places = self._blocks.ticks, len(self.order)
        blocks, last = self._blocks, dict(self._blocks.last)
        sampled = {target: set(parts) for target, parts in blocks.sampled.items()}
        for place, block in enumerate(self.order):
            at = int(leaves + self.way(here, block, round(leaves)) + CARRY)
            if at >= night:
                break
            until, series = night + 1, int(blocks.series[block])
            if series >= 0 and last[series] > FAR_BACK:
                # A visit of a series stands off from the one before, but not too far.
                at = max(at, last[series] + int(blocks.least[block]))
                until = min(until, last[series] + int(blocks.greatest[block]) + 1)
                if at >= min(until, night):
                    continue
            ahead = self._chosen[places - 1 - place][at:until]
            best = int(ahead.argmax())
            if place < len(self._start.first) and block == self._start.first[place]:
                # Wanted first: as soon as it may be, whatever else that costs.
                best = int(self._blocks.ready[block, at]) - at
                if at + best >= night:
                    continue
                held += 1
            elif ahead[best] < self._behind[places - 1 - place][at] or ahead[best] < 0.0:
                continue
            kept.append(block)
            ticks.append(at + best)
            if series >= 0:
                last[series] = at + best
            worth += self._worth_of(block, at + best, sampled)
            here = int(self._blocks.target[block])
            leaves = at + best + float(self._blocks.minutes[block]) * TICKS_PER_MIN
        if len(kept) < places:
            self._forget()
        self.order, self.ticks, self.held = kept, ticks, held
        # Worth is without what finishing plans of several blocks earns, value with it.
        self.worth = worth
        self.value = worth + self._blocks.finishing(kept)

    def _worth_of(self, block: int, tick: int, sampled: dict[int, set[int]]) -> float:
        """Return what a block is worth at a tick.

        Which visit of a standard is which does not matter: the first in each part of its airmass
        counts in full, whatever the tables say of the one that happens to stand there.
        """
        blocks = self._blocks
        value, target = float(blocks.value[block, tick]), int(blocks.target[block])
        if target not in sampled:
            return value
        part = int(blocks.parts_at[target][tick])
        told = 1.0 if part == blocks.own_part[block] else SAMPLED_SHARE
        counts = SAMPLED_SHARE if part in sampled[target] else 1.0
        sampled[target].add(part)
        return value * counts / told

    # Lags: ticks from the begin of one block to the begin of the next

    def _lag(self, place: int) -> int:
        """Return the lag from the block at a place (-1: the start) to the one after it."""
        here, lasts, after, at = self.edge(place, place + 1)
        if after is None:
            return round(lasts)
        return int(lasts + self.way(here, after, round(at + lasts)) + CARRY)

    def way(self, here: int, block: int, tick: int) -> float:
        """Return the ticks (not rounded) from a target to a block's at a tick."""
        minute = min(tick, self._blocks.ticks - 1) // TICKS_PER_MIN
        there = int(self._blocks.target[block])
        travel = self._travel
        which = (
            travel.stretch(minute)
            if travel.step_min
            else travel.west[here, minute] ^ travel.west[there, minute]
        )
        return float(travel.tables[which, here, there]) * TICKS_PER_MIN


def _best_from(table: Singles) -> Singles:
    """Return the greatest value at or after each tick."""
    found: Singles = np.maximum.accumulate(table[::-1])[::-1]
    return found


def later(table: Singles, lag: int) -> Singles:
    """Return a table read a number of ticks later; nothing is worth anything past the end."""
    moved = np.zeros(len(table), dtype=np.float32)
    if lag < len(table):
        moved[: len(table) - lag] = table[lag:]
    return moved


def _earlier(table: Singles, lag: int) -> Singles:
    """Return a table read a number of ticks earlier; nothing begins before the night."""
    moved = np.full(len(table), NEVER, dtype=np.float32)
    if lag < len(table):
        moved[lag:] = table[: len(table) - lag]
    return moved
