"""How good, how quick and how steady orders are, on random nights; figures anyone can repeat.

Run as ``python -m tests.bench.order quality|others|steady|warm [--nights N] [--sizes 20,50]``:

- ``quality``: percent of the proven limit, and time, for ours and for the plain rules;
- ``others``: the same beside astroplan's PriorityScheduler, which takes minutes at longer lists;
- ``steady``: what a change of seeing of 5 to 10 % changes in the next hour;
- ``warm``: how long it takes to plan again.

The seeds are not those the search was tuned on (``--tuning`` takes those). Times are wall
clock and, in brackets, this process's own, which a busy machine doesn't stretch.
"""

from __future__ import annotations

import argparse
from collections.abc import Callable

from tests.bench.order import others, quality, replan
from tests.bench.order.nights import KEPT_APART, TUNING

TABLES: dict[str, tuple[Callable[[list[int], int, int], None], str, int]] = {
    "quality": (quality.table, "20,50,100,200,500", 8),
    "others": (others.table, "20,50", 4),
    "steady": (replan.steady_table, "20,50,100,200,500", 8),
    "warm": (replan.warm_table, "50,500", 4),
}


def main() -> None:
    """Measure and print one table."""
    parser = argparse.ArgumentParser(description=__doc__.partition("\n")[0])
    parser.add_argument("table", nargs="?", default="quality", choices=TABLES)
    parser.add_argument("--nights", type=int, help="nights of each size")
    parser.add_argument("--sizes", help="numbers of targets, parted by commas")
    parser.add_argument("--tuning", action="store_true", help="the nights for tuning instead")
    arguments = parser.parse_args()
    table, sizes, nights = TABLES[arguments.table]
    table(
        [int(size) for size in (arguments.sizes or sizes).split(",")],
        arguments.nights or nights,
        TUNING if arguments.tuning else KEPT_APART,
    )


if __name__ == "__main__":
    main()
