"""How fast past nights are found again: ``python -m tests.bench.past --nights 3000``.

Writes an invented archive (`tests.bench.archive`), then prints how long the index takes to be made
from nothing with all cores, to be opened and looked over, to follow one changed log, and how long
each question takes, the first time and at best. ``--folder`` keeps the archive for the next time.
"""

from __future__ import annotations

import argparse
import os
import random
import tempfile
import time
from collections.abc import Callable
from datetime import date
from pathlib import Path

from engine.log import Note, night_logs
from engine.logbook import load_logbook
from engine.past import PastIndex, index_path
from engine.past.build import read_one
from engine.past.carry import carried
from engine.past.exposures import asked, frames_refused, history, refused, totals
from engine.past.fit import fit_images
from engine.past.nights import efficiency, nights
from engine.past.search import Wanted, condition, find_exposures, find_words
from engine.past.seeing import measurements, site_seeing
from tests.bench.archive import Archive, write_archive
from tests.engine.log_nights import blocks_of

OPENINGS, ASKED = 7, 5


def main() -> None:
    """Write the archive, make the index, ask."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--nights", type=int, default=300)
    parser.add_argument("--folder", type=Path, help="where the archive is kept (nowhere)")
    arguments = parser.parse_args()
    with tempfile.TemporaryDirectory(prefix="warmroom-past-") as name:
        folder = arguments.folder or Path(name, "nights")
        if not night_logs(folder):
            begin = time.perf_counter()
            for _ in write_archive(folder, Archive(arguments.nights)):
                pass
            report("archive written", time.perf_counter() - begin)
        measure(folder, Path(name, "cache"))


def measure(folder: Path, cache: Path) -> None:
    """Print all figures of one archive."""
    paths = night_logs(folder)
    size_mb = sum(path.stat().st_size for path in paths) / 1e6
    some = random.Random(1).sample(paths, min(40, len(paths)))
    begin = time.process_time()
    for path in some:
        read_one(path)
    report("one log read and folded, alone", (time.process_time() - begin) / len(some))
    begin = time.perf_counter()
    with PastIndex(folder, cache=cache) as index:
        report(f"cold build, {os.cpu_count()} cores", time.perf_counter() - begin)
        count = index.ask("SELECT count(*) FROM exposure")[0][0]
    kept_mb = index_path(folder, cache).stat().st_size / 1e6 if cache.exists() else 0.0
    print(
        f"{len(paths)} nights, {count} exposures, {size_mb:.0f} MB of logs, {kept_mb:.0f} MB kept"
    )
    report("opened and looked over", best(lambda: PastIndex(folder, cache=cache).close(), OPENINGS))
    last = paths[-1]
    written = last.read_bytes()
    last.write_bytes(written + blocks_of([Note(n=900_000, t_mjd=61000.0, text="one more")]))
    begin = time.perf_counter()
    PastIndex(folder, cache=cache).close()
    report("the same after one log has grown", time.perf_counter() - begin)
    last.write_bytes(written)
    with PastIndex(folder, cache=cache) as index:
        questions(index, folder)


def questions(index: PastIndex, folder: Path) -> None:
    """Print how long each question takes."""
    logbook = load_logbook(folder)
    names = [target.name for target in logbook.targets]
    many = max(totals(index), key=lambda each: each.count).target
    every: dict[str, Callable[[], object]] = {
        "all nights, a line each": lambda: nights(index),
        "where the time of all nights went": lambda: efficiency(nights(index)),
        "all totals": lambda: totals(index),
        "done and remaining of the list": lambda: asked(index, logbook),
        "carried over into tonight": lambda: carried(index, date.max, names),
        "history of the busiest target": lambda: history(index, many),
        "seeing of all nights": lambda: site_seeing(measurements(index)),
        "refused and why": lambda: refused(index),
        "the newest refused": lambda: frames_refused(index, most=200),
        "a word in all notes": lambda: find_words(index, "satellite"),
        "a text that is no word": lambda: find_words(index, "°"),
        "airmass < 1.1": lambda: find_exposures(index, limits("airmass<1.1")),
        "two limits, hardly ever met": lambda: find_exposures(
            index, limits("fwhm<0.9", "airmass>2")
        ),
        "fit of the images (makes tables)": lambda: fit_images(index, logbook.observatory),
    }
    print(f"{'question':40}{'first':>10}{'best':>10}")
    for what, ask in every.items():
        begin = time.perf_counter()
        ask()
        first = time.perf_counter() - begin
        print(f"{what:40}{first * 1e3:7.1f} ms{best(ask, ASKED) * 1e3:7.1f} ms")


def limits(*texts: str) -> Wanted:
    """Return a search by limits."""
    return Wanted(conditions=tuple(condition(text) for text in texts))


def best(call: Callable[[], object], times: int) -> float:
    """Return the least time (s) of a call."""
    took = []
    for _ in range(times):
        begin = time.perf_counter()
        call()
        took.append(time.perf_counter() - begin)
    return min(took)


def report(what: str, seconds: float) -> None:
    """Print one figure."""
    print(f"{what:40}{seconds * 1e3:10.1f} ms" if seconds < 1.0 else f"{what:40}{seconds:10.1f} s")


if __name__ == "__main__":
    main()
