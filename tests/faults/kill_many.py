"""Kill the log's writer thousands of times: ``python -m tests.faults.kill_many [KILLS]``."""

from __future__ import annotations

import sys
import tempfile
import time
from pathlib import Path

from tests.faults.log_deaths import kill_often


def main(kills: int) -> int:
    """Kill, count and print; return 1 if anything acknowledged was lost or anything invented."""
    begin = time.perf_counter()
    with tempfile.TemporaryDirectory(prefix="warmroom-kills-") as folder:
        tally = kill_often(kills, Path(folder), seed=kills)
        torn = len(list(Path(folder).glob("*/*.torn-*")))
    print(
        f"{tally.tried} kills, {torn} of them in the middle of an entry; in all readings together "
        f"{tally.acknowledged} acknowledged entries, {tally.lost} lost, {tally.invented} invented; "
        f"{time.perf_counter() - begin:.0f} s"
    )
    return 1 if tally.lost or tally.invented else 0


if __name__ == "__main__":
    sys.exit(main(int(sys.argv[1]) if len(sys.argv) > 1 else 2000))
