"""What the console costs: bytes, latency, CPU, memory: ``python -m tests.bench.console``.

Runs the real program in a pseudo-terminal on the sample logbook with so many targets more, and sets
each figure beside its budget. Latency is from a key written to the first byte of its paint, while
the list is updated by a clock that runs fast; bytes and CPU are of a console left alone at the
night's own pace, and CPU also during a run.
"""

from __future__ import annotations

import argparse
import os
import statistics
import tempfile
import time
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from engine.rehearsal import NIGHT, prepare
from tests.tui.terminal import Terminal

SETTLE_S, IDLE_S = 8.0, 20.0
KEYS = 200
QUIET_S = 0.03
MIB = 1024.0 * 1024.0


@dataclass(frozen=True)
class Figure:
    """One figure, its unit and its budget."""

    name: str
    value: float
    unit: str
    budget: float

    def text(self) -> str:
        """Return it beside its budget."""
        share = self.value / self.budget
        verdict = "" if share <= 1.0 else "   OVER"
        return (
            f"{self.name:34s} {self.value:8.1f} {self.unit:8s} budget {self.budget:g}: "
            f"{share:5.0%}{verdict}"
        )


def a_long_list(folder: Path, targets: int) -> None:
    """Put so many targets more into a prepared logbook, all round the sky."""
    random = np.random.default_rng(1)
    text = "".join(
        f'[[target]]\nname = "Q {number:03d}"\nra = {random.uniform(0, 360):.4f}\n'
        f"dec = {random.uniform(-85, 40):.4f}\npriority = {random.integers(1, 6)}\n"
        'exposures = [ { filter = "V", seconds = 60, count = 3 } ]\n\n'
        for number in range(targets)
    )
    (folder / "targets").mkdir()
    (folder / "targets" / "many.toml").write_text(text)


def opened(folder: Path, size: tuple[int, int], pace: float) -> Terminal:
    """Return a console that has settled."""
    words = ["demo", "--drive", "--pace", f"{pace:g}", "--into", str(folder)]
    terminal = Terminal(words, *size)
    terminal.wait_for("in the order", 60.0)
    until = time.monotonic() + SETTLE_S
    while time.monotonic() < until:
        terminal.read(0.2)
    return terminal


def cpu_s(terminal: Terminal) -> float:
    """Return the seconds of CPU the program has used."""
    fields = Path(f"/proc/{terminal.child.pid}/stat").read_text().rsplit(")", 1)[1].split()
    return (int(fields[11]) + int(fields[12])) / os.sysconf("SC_CLK_TCK")


def resident_mib(terminal: Terminal) -> float:
    """Return the memory it has resident."""
    for line in Path(f"/proc/{terminal.child.pid}/status").read_text().splitlines():
        if line.startswith("VmRSS"):
            return int(line.split()[1]) * 1024.0 / MIB
    return float("nan")


def left_alone(terminal: Terminal) -> tuple[float, float]:
    """Return bytes a second and percent of one core while nobody types."""
    bytes_before, cpu_before, began = terminal.bytes_read, cpu_s(terminal), time.monotonic()
    while time.monotonic() - began < IDLE_S:
        terminal.read(0.5)
    seconds = time.monotonic() - began
    return (
        (terminal.bytes_read - bytes_before) / seconds,
        (cpu_s(terminal) - cpu_before) / seconds * 100.0,
    )


def latencies_ms(terminal: Terminal) -> list[float]:
    """Return the milliseconds from a key to the first byte of its paint."""
    found = []
    for number in range(KEYS):
        # What a tick of the clock paints must not be taken for the answer.
        while terminal.is_drawing(QUIET_S):
            terminal.read(QUIET_S)
        began = time.perf_counter()
        terminal.press("j" if number % 40 < 20 else "k")
        if terminal.is_drawing(2.0):
            found.append((time.perf_counter() - began) * 1e3)
        terminal.read(QUIET_S)
    return found


def measure(folder: Path, size: tuple[int, int]) -> list[Figure]:
    """Return every figure at one size."""
    terminal = opened(folder, size, 60.0)
    try:
        keys = latencies_ms(terminal)
    finally:
        terminal.kill()
    terminal = opened(folder, size, 1.0)
    try:
        sent, idle = left_alone(terminal)
        for _ in range(3):
            terminal.press(" ")
            terminal.read(1.5)
        _, busy = left_alone(terminal)
        resident = resident_mib(terminal)
    finally:
        terminal.kill()
    return [
        Figure("sent while left alone", sent, "bytes/s", 2000.0),
        Figure("key to paint, median", statistics.median(keys), "ms", 30.0),
        Figure("key to paint, 90 %", float(np.quantile(keys, 0.9)), "ms", 30.0),
        Figure("of one core, left alone", idle, "%", 5.0),
        Figure("of one core, in a run", busy, "%", 5.0),
        Figure("resident memory", resident, "MiB", 150.0),
    ]


def main() -> None:
    """Measure and print."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--targets", type=int, default=500, help="how many targets more")
    targets = parser.parse_args().targets
    for size in ((80, 24), (160, 50)):
        with tempfile.TemporaryDirectory() as where:
            folder = Path(where) / "nights"
            folder = prepare(folder, NIGHT, 7).folder
            a_long_list(folder, targets)
            print(f"{size[0]}x{size[1]}, {62 + targets} targets")
            for figure in measure(folder, size):
                print(f"  {figure.text()}", flush=True)


if __name__ == "__main__":
    main()
