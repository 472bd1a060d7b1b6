"""What the night log stands, and how fast it is: ``python -m tests.bench.log``.

Prints, for each fault, how often it was tried, how many entries were acknowledged (in all readings
together), lost and invented; then how long an append and the opening of a night take.
"""

from __future__ import annotations

import os
import statistics
import tempfile
import time
import tomllib
from collections.abc import Callable
from pathlib import Path

from engine.log import Disk, fold, read_log
from tests.engine.log_nights import NAME, exposure, log_bytes, night, open_log
from tests.faults.log_deaths import UnsyncedDisk, cut_power, kill_often
from tests.faults.log_disks import fail_at_random, fill_disk, in_a_child, small_disk
from tests.faults.log_faults import (
    Tally,
    cut_for_readers,
    cut_for_the_writer,
    flip_bits,
    follow_through_tears,
    sample,
)

EXPOSURES = 500


def full_disk(folder: Path) -> Tally:
    """Fill a memory disk, where this user may mount one."""
    with small_disk(folder / "disk", "256k") as disk:
        return fill_disk(disk) if disk else Tally("disk full (no memory disk can be mounted here)")


def power(folder: Path, disk: Disk) -> Tally:
    """Cut the power of a file system in a file, where this user may mount one."""
    return cut_power(100, folder, 1, disk) or Tally("power cut (nothing can be mounted here)")


TRIALS: tuple[Callable[[Path], Tally], ...] = (
    lambda folder: cut_for_readers(sample(12)),
    lambda folder: cut_for_the_writer(sample(4), folder),
    lambda folder: flip_bits(sample(6)),
    lambda folder: kill_often(200, folder, seed=1),
    lambda folder: power(folder, Disk()),
    lambda folder: power(folder, UnsyncedDisk()),
    full_disk,
    lambda folder: in_a_child("reach_size_limit", folder),
    lambda folder: fail_at_random(50, folder, seed=1),
    lambda folder: follow_through_tears(300, folder, seed=1),
)


def main() -> None:
    """Try every fault, measure, and print."""
    print(f"{'fault':34}{'tried':>8}{'acknowledged':>14}{'lost':>6}{'invented':>10}")
    for trial in TRIALS:
        with tempfile.TemporaryDirectory(prefix="warmroom-log-") as folder:
            tally = trial(Path(folder))
        print(
            f"{tally.fault:34}{tally.tried:8}{tally.acknowledged:14}{tally.lost:6}"
            f"{tally.invented:10}"
        )
    with tempfile.TemporaryDirectory(prefix="warmroom-log-") as folder:
        print()
        appends(Path(folder), "append, acknowledged on disk", Disk())
        appends(Path(folder), "the same without the sync", UnsyncedDisk())
        opening(Path(folder))


def appends(folder: Path, what: str, disk: Disk, count: int = 1000) -> None:
    """Append full records of exposures, each until it is acknowledged."""
    (folder / NAME).unlink(missing_ok=True)
    log = open_log(folder, disk)
    took_ms = []
    for n in range(1, count + 1):
        event = exposure(n, 1.0)
        begin = time.perf_counter()
        log.append(event)
        took_ms.append(1e3 * (time.perf_counter() - begin))
    log.close()
    cuts = statistics.quantiles(took_ms, n=100)
    print(f"{what:34}{cuts[49]:8.2f} ms median{cuts[98]:8.2f} ms at 99 %, {count} appends")


def opening(folder: Path) -> None:
    """Open, read and fold a night of 500 exposures."""
    path = folder / NAME
    path.write_bytes(log_bytes(night(EXPOSURES)))
    size_kb = os.path.getsize(path) / 1e3
    print(f"a night of {EXPOSURES} exposures, {2 * EXPOSURES} entries, {size_kb:.0f} kB:")

    def open_and_close() -> None:
        open_log(folder).close()

    def by_tomllib() -> None:
        tomllib.loads(path.read_text(encoding="utf-8"))

    events = read_log(path).events
    report("read", lambda: read_log(path))
    report("folded", lambda: fold(events))
    report("opened for writing, and closed", open_and_close)
    report("tomllib alone, for comparison", by_tomllib)


def report(what: str, call: Callable[[], object], times: int = 15) -> None:
    """Print the median and the least time that a call takes."""
    took_ms = []
    for _ in range(times):
        begin = time.perf_counter()
        call()
        took_ms.append(1e3 * (time.perf_counter() - begin))
    print(f"  {what:32}{statistics.median(took_ms):8.1f} ms median{min(took_ms):8.1f} ms at best")


if __name__ == "__main__":
    main()
