"""Digests of many logs: with all cores where there are many, one after another where few."""

from __future__ import annotations

import multiprocessing
import os
import time
from collections.abc import Callable, Iterator, Sequence
from concurrent.futures import ProcessPoolExecutor
from concurrent.futures.process import BrokenProcessPool
from pathlib import Path

from engine.past.digest import Digest, digest, fingerprint
from engine.past.schema import Stamp

# From how many logs on starting further processes pays (common practice, no source: each takes
# about half a second to come up, a log about 30 ms).
MANY = 60
HANDED_OVER = 8

Read = tuple[Digest, Stamp]
Progress = Callable[[int, int], None]


def read_one(path: Path) -> Read:
    """Return a log's digest and by what its file is known again; never raises for a bad file.

    The file is looked at before and after: one that changes meanwhile gets a stamp that will not
    fit it, so that it is read again.
    """
    seen_ns = time.time_ns()
    try:
        before = path.stat()
        data = path.read_bytes()
    except OSError as error:
        gone = Digest(path.name, path.stem, "unreadable", (error.strerror or "can't be read",))
        return gone, Stamp(-1, -1, 0, seen_ns)
    stamp = Stamp(len(data), before.st_mtime_ns, fingerprint(data), seen_ns)
    return digest(path, data), stamp


def read_all(paths: Sequence[Path], progress: Progress | None = None) -> Iterator[Read]:
    """Return the digests of logs one by one, in the order given.

    ``progress`` is told how many of how many are done. Where processes can't be had, or one of them
    dies, the rest is read here.
    """
    told = progress or (lambda done, of: None)
    done = 0
    told(done, len(paths))
    if len(paths) >= MANY and (os.cpu_count() or 1) > 1:
        try:
            for read in _read_by_all_cores(paths):
                yield read
                done += 1
                told(done, len(paths))
        except (BrokenProcessPool, OSError):
            # Nothing is lost: what came back was whole.
            pass
    for path in paths[done:]:
        yield read_one(path)
        done += 1
        told(done, len(paths))


def _read_by_all_cores(paths: Sequence[Path]) -> Iterator[Read]:
    # Started afresh, not forked: a child must not hold the log that this process may have locked.
    context = multiprocessing.get_context("spawn")
    pool = ProcessPoolExecutor(max_workers=os.cpu_count(), mp_context=context)
    try:
        yield from pool.map(read_one, paths, chunksize=HANDED_OVER)
    finally:
        pool.shutdown(wait=False, cancel_futures=True)
