"""Targets the observer pinned to a moment: placed whatever their merit, as near it as may be.

To the search, to begin a pinned target in time is worth more than a whole night can be, less for
every minute it is late; so an order without it is never taken for a better one. The merit itself
knows nothing of pins, and the value of an order is told without them.
"""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from engine.order.problem import Problem

# A pinned target that may not be begun so many minutes after its moment is no longer held to it.
LATE_AT_MOST_MIN = 30.0
# Priority 5, quality 2, for twenty hours: no night is worth as much.
PIN_WORTH = 5.0 * 2.0 * 20.0 * 3600.0


def pin_worths(
    problem: Problem, target: int, begin_min: NDArray[np.float64]
) -> NDArray[np.float32]:
    """Return what it counts to begin a pinned target's exposures at some minutes."""
    late_min = np.maximum(begin_min - problem.pins[target], 0.0)
    share = np.where(late_min <= LATE_AT_MOST_MIN, 1.0 - 0.5 * late_min / LATE_AT_MOST_MIN, 0.0)
    return (PIN_WORTH * share).astype(np.float32)
