"""What a minute is worth at each hour of the night: prices, by bidding.

The night is cut into stretches. A line of a plan wants its minutes where worth less price is
greatest; a stretch that is wanted for more minutes than it has grows dearer, one that is not grows
cheaper. Whatever the prices are,

    sum of price x minutes of the night  +  sum over lines of minutes x max(worth - price, 0)

is never less than the value of any order of these lines (weak duality of linear programming, see
any textbook), so the best prices are those that make it least. `engine.order.bound` makes that
rigorous for whole exposures; here it only guides the search.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.order.blocks import NEVER, TICKS_PER_MIN, Blocks

Singles = NDArray[np.float32]

STRETCH_MIN = 10
ROUNDS = 60
# Time on the way to a visit, on average, in minutes: only the prices use it.
WAY_MIN = 1.0


def price_of_time(blocks: Blocks, start_tick: int, rounds: int = ROUNDS) -> Singles:
    """Return the price of each tick (K,), in units of value per tick."""
    width = STRETCH_MIN * TICKS_PER_MIN
    ticks = blocks.ticks
    if not len(blocks.target) or ticks == 0:
        return np.zeros(ticks, dtype=np.float32)
    begins = np.arange(start_tick, ticks, width)
    lengths = (blocks.minutes + WAY_MIN) * TICKS_PER_MIN
    middle = np.minimum(begins + width // 2, ticks - 1)
    # A block is asked of the stretch in which its middle falls.
    at = np.clip(middle[None] - (lengths[:, None] / 2).astype(int), 0, ticks - 1)
    value = np.take_along_axis(blocks.value, at, axis=1)
    rate = np.where(value > NEVER, value / lengths[:, None], np.float32(-1.0)).astype(np.float32)
    prices = _bid(rate, lengths, np.minimum(width, ticks - begins).astype(np.float32), rounds)
    by_tick = np.zeros(ticks, dtype=np.float32)
    by_tick[start_tick:] = np.repeat(prices, width)[: ticks - start_tick]
    return by_tick


def _bid(rate: Singles, lengths: Singles, room: Singles, rounds: int) -> Singles:
    """Return the prices (S,) with the least total of a number of rounds of bidding."""
    scale = float(np.quantile(np.maximum(rate.max(axis=1), 0.0), 0.7)) or 1.0
    prices = np.full(len(room), 0.5 * scale, dtype=np.float32)
    best, least = prices, np.inf
    rows, columns = np.arange(len(rate)), len(room)
    for turn in range(rounds):
        margin = rate - prices[None]
        choice = margin.argmax(axis=1)
        gain = margin[rows, choice]
        wanting = gain > 0.0
        total = float(prices @ room) + float((gain * lengths)[wanting].sum())
        if total < least:
            least, best = total, prices
        asked = np.bincount(choice[wanting], weights=lengths[wanting], minlength=columns)
        # The bid is clipped: one crowded stretch must not drive its price beyond all sense.
        step = np.clip(asked / room - 1.0, -1.0, 1.5).astype(np.float32)
        prices = np.maximum(prices + (0.35 * scale / (1.0 + 0.25 * turn)) * step, 0.0)
    return best
