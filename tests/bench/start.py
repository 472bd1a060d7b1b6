"""How soon the console is there, and what it sends while idle: ``python -m tests.bench.start``.

Runs the real program in a pseudo-terminal on the sample logbook, several times; prints medians.
"""

from __future__ import annotations

import argparse
import statistics
import tempfile
import time
from pathlib import Path

from tests.tui.terminal import Terminal

IDLE_S = 10.0


def one_start(folder: Path, columns: int, rows: int) -> tuple[float, float, float]:
    """Return seconds to first paint, seconds to the live list, and bytes a second while idle."""
    words = ["demo", "--drive", "--pace", "1", "--into", str(folder)]
    terminal = Terminal(words, columns, rows)
    try:
        terminal.wait_for("opening the night")
        painted_s = time.monotonic() - terminal.started_s
        terminal.wait_for("in the order")
        alive_s = time.monotonic() - terminal.started_s
        # The first plan's notices and the list settle first.
        terminal.read(1.0)
        until = time.monotonic() + 1.0
        while time.monotonic() < until:
            terminal.read(0.2)
        before, began = terminal.bytes_read, time.monotonic()
        while time.monotonic() - began < IDLE_S:
            terminal.read(0.5)
        idle = (terminal.bytes_read - before) / (time.monotonic() - began)
    finally:
        terminal.kill()
    return painted_s, alive_s, idle


def main() -> None:
    """Print the medians of a few starts at two sizes."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--starts", type=int, default=5)
    starts = parser.parse_args().starts
    print(f"medians of {starts} starts; 62 targets, idle for {IDLE_S:g} s with a clock that ticks")
    for columns, rows in ((80, 24), (160, 50)):
        with tempfile.TemporaryDirectory() as folder:
            runs = [one_start(Path(folder), columns, rows) for _ in range(starts)]
        painted_s, alive_s, idle = (statistics.median(each) for each in zip(*runs, strict=True))
        print(
            f"{columns}x{rows}: first paint {painted_s:.2f} s, list alive {alive_s:.2f} s, "
            f"idle {idle:.0f} bytes/s"
        )


if __name__ == "__main__":
    main()
