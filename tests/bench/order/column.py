"""One method's results: shares and times, a night each."""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass, field

import numpy as np


@dataclass
class Column:
    """Shares of the proven limit, and milliseconds by the wall and of this process."""

    shares: list[float] = field(default_factory=list)
    wall_ms: list[float] = field(default_factory=list)
    own_ms: list[float] = field(default_factory=list)

    def timed(self, method: Callable[[], float], limit: float) -> None:
        """Add what a method reaches of a limit, and how long it takes."""
        wall_s, own_s = time.perf_counter(), time.process_time()
        self.shares.append(method() / limit)
        self.wall_ms.append((time.perf_counter() - wall_s) * 1e3)
        self.own_ms.append((time.process_time() - own_s) * 1e3)

    def quality(self) -> str:
        """Return mean and worst share, in percent."""
        shares = np.array(self.shares) * 100.0
        return f"{shares.mean():5.1f} {shares.min():6.1f}"

    def times(self) -> str:
        """Return the median and 95 % of the wall's milliseconds, and the process's own median."""
        median, most = np.percentile(self.wall_ms, [50, 95])
        return f"{median:7.0f} {most:7.0f} ({np.median(self.own_ms):.0f})"
